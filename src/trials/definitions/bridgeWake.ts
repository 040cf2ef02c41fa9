/** Along the lee of the bridge's piers at the estuary: in and out of their wakes at a steady lean. */
import { parseScene } from '../../craft/scene.ts';
import { heightError, peakTilt, rmsRateError, saturation, timeToTouch } from '../scores.ts';
import { defineTrial } from '../trial.ts';
import rawBridge from '../../../scenes/estuary-bridge.scene.json' with { type: 'json' };

const BRIDGE = parseScene(rawBridge, 'estuary-bridge.scene.json');
/** East of the deck and short of the landing stage; the piers' wakes reach out over it. */
const SCENE = { ...BRIDGE, start: { position_m: [0, 12, 0] as [number, number, number], heading_deg: 0 } };
const DURATION_S = 11;

export const bridgeWake = defineTrial({
  name: 'bridge-wake',
  title: 'Across the wakes of bridge piers',
  purpose: 'North along the lee of the estuary bridge, through the wakes of its piers.',
  parameters: {
    mean_mps: { value: 8, least: 0, most: 25, meaning: 'mean wind along the channel' },
    lean: { value: 0.25, least: 0.05, most: 1, meaning: 'pitch stick held, nose down' },
    into: { value: 0.25, least: 0, most: 1, meaning: 'roll stick held against the wind' },
  },
  scores: [peakTilt(30), heightError(1), rmsRateError(12), saturation(5), timeToTouch(DURATION_S - 0.05)],
  traceSignals: [
    'rate_roll_dps',
    'rate_pitch_dps',
    'rate_yaw_dps',
    'wind_n_mps',
    'wind_e_mps',
    'north_m',
    'east_m',
    'down_m',
  ],
  scene: SCENE,
  duration_s: () => DURATION_S,
  start: () => ({ kind: 'hover', height_m: 6 }),
  wind: (p) => ({
    ...BRIDGE.wind,
    mean_mps: p.mean_mps,
    turbulence: { model: 'MIL-F-8785C', windAt20ft_mps: p.mean_mps },
    gusts: [],
  }),
  scored: () => [1, DURATION_S],
  sticks: (time_s, sticks, _flight, p) => {
    sticks.levelling = true;
    sticks.heightHold = true;
    sticks.throttle = 0.5;
    sticks.pitch = time_s > 1 && time_s < DURATION_S - 1.5 ? -p.lean : 0;
    sticks.roll = -p.into;
  },
});
