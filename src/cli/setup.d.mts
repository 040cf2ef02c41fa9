export const root: string;
export function ensurePackages(): void;
export function findChromium(): string | null;
export function ensureChromium(): string | null;
