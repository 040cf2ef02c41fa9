/** Unit factors that have one home. */
export const RAD_PER_DEG = Math.PI / 180;
export const DEG_PER_RAD = 180 / Math.PI;
export const RAD_PER_S_PER_RPM = Math.PI / 30;
export const RPM_PER_RAD_PER_S = 30 / Math.PI;
/** Standard gravity, ISO 80000-3 / CGPM 1901, m/s². */
export const GRAVITY_MPS2 = 9.80665;
