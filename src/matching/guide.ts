/** What makes a log worth having: how to log, what to fly, how long, how large, and what to beware of. */

export interface GuideStep {
  readonly title: string;
  readonly how: string;
  readonly seconds: number;
  /** What is read from it. */
  readonly gives: string;
}

export interface LogGuide {
  readonly before: readonly string[];
  readonly logging: readonly string[];
  readonly steps: readonly GuideStep[];
  readonly cautions: readonly string[];
}

/** Sizes are common practice (Tischler & Remple, ch. 5, for sweeps and doublets); no standard sets them. */
export const LOG_GUIDE: LogGuide = {
  before: [
    'The craft flies and holds by itself with the gains it has. A log is no way to find out whether it flies.',
    'Weigh it as it will fly. A matched build belongs to that mass and those propellers.',
    'Battery above half and balanced, so that its sag stays small over the log.',
    'Calm air. Gusts are told apart from the craft’s own motion, but each costs certainty.',
  ],
  logging: [
    'One row for each tick of the rate loop, or an exact divisor of it: 400 Hz to 2 kHz. Below 100 Hz lag and delay blur.',
    'Time of the row as a counter in µs or in seconds with six decimals; it may wrap.',
    'Per axis: the rate setpoint and the gyro’s rate as the controller saw it, before its filters.',
    'The four motor commands as sent, after limits, with the corner each belongs to; or the axis commands.',
    'Throttle. Attitude, rotor speeds and speed of descent where there are any: they show units and prop wash.',
    'Rows that are dropped now and then, and time stamps that jitter, do no harm. Averaged or smoothed rows do.',
  ],
  steps: [
    {
      title: 'Hover',
      how: 'Hold still at 10 m or higher, sticks at rest.',
      seconds: 15,
      gives: 'Noise, vibration lines, the command it hovers at.',
    },
    {
      title: 'Roll doublets',
      how: 'Push right and back through centre to left, each side 0.15 to 0.4 s, about a third of full rate; rest a second; fifteen times. Bank stays below 30 degrees.',
      seconds: 30,
      gives: 'Gain, lag and delay of roll.',
    },
    {
      title: 'Pitch doublets',
      how: 'The same nose up and down.',
      seconds: 30,
      gives: 'Gain, lag and delay of pitch.',
    },
    {
      title: 'Yaw doublets',
      how: 'The same nose right and left, each side up to 0.4 s, up to half of full rate.',
      seconds: 30,
      gives: 'Gain and lag of yaw, and the rotors’ own reaction.',
    },
    {
      title: 'Sweep, where the firmware can play one',
      how: 'From 0.5 to 12 Hz in 30 s on one axis at a time, 20 to 40 deg/s; let go at once if it does not damp out.',
      seconds: 90,
      gives: 'The frequency response over the whole band in one go.',
    },
    {
      title: 'Hover',
      how: 'As at the start.',
      seconds: 10,
      gives: 'What the battery’s sag changed.',
    },
  ],
  cautions: [
    'Somebody who flies it well flies it; a second person watches the air and the area.',
    'A clear area, nobody within 30 m and nobody below; eye protection for all who are near when it is armed.',
    'Kill switch tested before every flight. Propellers off for everything that is tried on the bench.',
    'Begin at half the size. Look at the log and feel the motors for heat before the full size.',
    'One axis at a time. Stop when anything rings, smells or sounds new.',
    'Land with a third of the battery left; let it cool before it is charged.',
    'The local aviation rules, and the practice of those licensed under them, come before this list.',
  ],
};
