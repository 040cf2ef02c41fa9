/** Worksheets to print and take to the bench: what to fetch, what to do, what to write down, what to mind. */

export interface WorksheetField {
  readonly label: string;
  readonly unit: string;
  /** How many times it is written down. */
  readonly repeats: number;
}

export interface Worksheet {
  readonly id:
    | 'balance'
    | 'swing-bifilar'
    | 'swing-compound'
    | 'parts'
    | 'stand'
    | 'spinup'
    | 'still-rest'
    | 'still-idle';
  readonly title: string;
  readonly purpose: string;
  readonly tools: readonly string[];
  readonly cautions: readonly string[];
  readonly steps: readonly string[];
  readonly fields: readonly WorksheetField[];
  /** What the file or the page makes of it. */
  readonly result: string;
}

const PROPELLERS_OFF = 'Propellers off. Flight battery disconnected until a step says otherwise.';
const HANGING =
  'Check string, knots and hooks with twice the weight before the craft hangs on them; keep a cushion below and hands and face out of the way.';
const BATTERY =
  'A damaged, swollen or warm battery is not used. Charge and store it as its maker says, never unattended.';
const GUARDED =
  'Stand bolted down, propeller undamaged and tight, guard between you and its plane. Nobody in line with the disc.';
const EYES = 'Eye protection on, sleeves and cables tied back, others out of the room or behind the guard.';
const CUT_OFF = 'Somebody has a hand on the switch that cuts the power; try it once before the run.';
const RULES =
  'Local aviation and workshop rules come first; where they ask for a licensed person, work under one.';

const field = (label: string, unit: string, repeats = 1): WorksheetField => ({ label, unit, repeats });

export const WORKSHEETS: readonly Worksheet[] = [
  {
    id: 'balance',
    title: 'Weighing and centre of mass',
    purpose: 'All-up mass and where it acts; rotor positions are measured from the same origin.',
    tools: [
      'two scales of equal height, 1 g or finer',
      'tape, 1 mm',
      'wedge or ruler on edge',
      'protractor or level app',
    ],
    cautions: [PROPELLERS_OFF, 'Put battery and payload where they fly. Tape loose leads down.'],
    steps: [
      'Mark the body origin on the frame. x is forward, y to the right, z down.',
      'Weigh the whole craft once.',
      'Rest nose and tail each on a scale; write down both readings and where each scale touches, from the origin.',
      'Do the same left and right.',
      'For the height, raise the nose by 20 to 30° on the same two contact points and read both scales again.',
      'Or balance the craft on an edge, mark the line, turn it round, balance it again.',
    ],
    fields: [
      field('whole craft', 'kg', 2),
      field('front scale', 'kg'),
      field('front contact, x', 'm'),
      field('rear scale', 'kg'),
      field('rear contact, x', 'm'),
      field('left scale', 'kg'),
      field('left contact, y', 'm'),
      field('right scale', 'kg'),
      field('right contact, y', 'm'),
      field('tilt', 'deg'),
      field('tilted, front scale', 'kg'),
      field('tilted, rear scale', 'kg'),
      field('contact points, z', 'm'),
    ],
    result: 'mass and centre of mass with their uncertainty',
  },
  {
    id: 'swing-bifilar',
    title: 'Swing test on two wires',
    purpose: 'Moment of inertia about the vertical as it hangs; once for each of roll, pitch and yaw.',
    tools: [
      'two thin wires or braided lines of equal length, at least 1 m',
      'scale',
      'tape, 1 mm',
      'stopwatch or camera',
      'protractor',
    ],
    cautions: [PROPELLERS_OFF, HANGING, BATTERY],
    steps: [
      'Weigh the craft as it will hang, without cradle; weigh the cradle alone.',
      'Hang it so that the axis to be measured is vertical and the centre of mass lies midway between the wires.',
      'Make the wires parallel: the same distance above as below.',
      'Measure the distance between the wires and their free length.',
      'Turn it by 5 to 10° about the vertical and let go without pushing; no swinging to and fro.',
      'Time 20 full swings, there and back. Five times or more.',
      'Take the craft out and time the cradle alone on the same wires.',
    ],
    fields: [
      field('axis (roll, pitch, yaw)', ''),
      field('mass of craft', 'kg'),
      field('mass of cradle', 'kg'),
      field('distance between wires', 'm', 2),
      field('free length of wires', 'm', 2),
      field('first angle', 'deg'),
      field('last angle', 'deg'),
      field('swings', '', 5),
      field('time', 's', 5),
      field('cradle alone: swings', '', 3),
      field('cradle alone: time', 's', 3),
    ],
    result: 'moment of inertia about that axis with its uncertainty and what makes it up',
  },
  {
    id: 'swing-compound',
    title: 'Swing test about a pivot',
    purpose:
      'Moment of inertia where two wires cannot be hung; also finds the distance to the centre of mass.',
    tools: [
      'knife edge, thin rod or two hooks in line',
      'scale',
      'tape, 1 mm',
      'stopwatch or camera',
      'protractor',
    ],
    cautions: [PROPELLERS_OFF, HANGING, BATTERY],
    steps: [
      'Hang the craft so that it swings freely about an axis parallel to the one measured.',
      'Measure from the pivot to the centre of mass, or hang it at two lengths and measure the difference of the lengths.',
      'Let it swing through 5 to 10°; time 20 full swings, five times or more, at each length.',
    ],
    fields: [
      field('axis (roll, pitch, yaw)', ''),
      field('mass of craft', 'kg'),
      field('pivot to centre of mass, or first length', 'm'),
      field('second length', 'm'),
      field('first angle', 'deg'),
      field('swings, first length', '', 5),
      field('time, first length', 's', 5),
      field('swings, second length', '', 5),
      field('time, second length', 's', 5),
    ],
    result: 'moment of inertia and pivot distance with their uncertainty',
  },
  {
    id: 'parts',
    title: 'Inertia from parts',
    purpose: 'An estimate where no swing test was made.',
    tools: ['scale', 'tape or caliper'],
    cautions: [PROPELLERS_OFF],
    steps: [
      'List the heavy parts: battery, motors, arms, plates, payload, wiring as one lump.',
      'For each: mass, a shape (box, cylinder, point), its edges or radius and length, and where its middle lies from the origin.',
      'Compare the sum with the weighed craft; what is missing is wiring and screws.',
    ],
    fields: [
      field('part', '', 12),
      field('mass', 'kg', 12),
      field('shape and sizes', 'm', 12),
      field('middle x, y, z', 'm', 12),
      field('weighed craft', 'kg'),
    ],
    result: 'inertia tensor, mass and centre of mass, each with a larger doubt than a swing test has',
  },
  {
    id: 'stand',
    title: 'Thrust stand',
    purpose: 'Thrust and torque against speed, dead zone, command to speed, efficiency, KV, R and I₀.',
    tools: [
      'thrust stand with speed reading, guarded',
      'the flight ESC, motor and propeller',
      'battery or supply at flight voltage',
      'barometer and thermometer, or the elevation',
    ],
    cautions: [GUARDED, EYES, CUT_OFF, BATTERY, RULES],
    steps: [
      'Write down pressure and temperature, or elevation, propeller diameter and motor poles.',
      'Without propeller first: check the direction of turning and the sensor’s zero.',
      'With propeller: record 10 s with the motor at rest.',
      'From the smallest command in twenty steps to full; hold each until speed and thrust are steady, about 3 s.',
      'Come down in the same steps. Do not stay at full command longer than the motor bears.',
      'If the pack sags much, repeat at a second voltage; keep it as a second file.',
    ],
    fields: [
      field('propeller diameter', 'm'),
      field('motor poles', ''),
      field('air temperature', '°C'),
      field('air pressure', 'hPa'),
      field('elevation', 'm'),
      field('command', 'µs', 20),
      field('speed', 'rev/min', 20),
      field('thrust', 'g', 20),
      field('torque', 'N·m', 20),
      field('voltage', 'V', 20),
      field('current', 'A', 20),
    ],
    result: 'coefficients with residuals, static table, dead zone, motor constants',
  },
  {
    id: 'spinup',
    title: 'Motor spin-up',
    purpose: 'How quickly a rotor follows a command, up and down.',
    tools: [
      'thrust stand or the craft held fast on a guarded bench',
      'speed recorded at 500 Hz or faster, with the command on the same clock',
    ],
    cautions: [GUARDED, EYES, CUT_OFF, BATTERY, RULES],
    steps: [
      'Start at the hover command and wait until the speed is steady.',
      'Step the command up by a tenth of its range at once, hold 1 s, step back, hold 1 s.',
      'Five times. Then the same with three tenths.',
      'Record time, command and speed in one file.',
    ],
    fields: [
      field('file', ''),
      field('hover command', 'µs'),
      field('step', 'µs', 2),
      field('recording rate', 'Hz'),
    ],
    result: 'lag up, lag down and delay with their uncertainty',
  },
  {
    id: 'still-rest',
    title: 'Gyro at rest',
    purpose: 'Noise, resolution, bias and drift of the gyro.',
    tools: ['the flight controller on the craft, logging its gyro as fast as it can'],
    cautions: [PROPELLERS_OFF, 'Motors stay off.'],
    steps: [
      'Set the craft on a heavy table, away from machines and from steps on the floor.',
      'Let the electronics warm up for five minutes.',
      'Log two minutes without touching anything; ten minutes for drift.',
      'Note the unit of the log: deg/s or rad/s, and the full scale set in the sensor.',
    ],
    fields: [
      field('file', ''),
      field('unit of the gyro columns', ''),
      field('full scale', 'deg/s'),
      field('loop rate', 'Hz'),
    ],
    result: 'noise density, bandwidth, bias, resolution, Allan deviation',
  },
  {
    id: 'still-idle',
    title: 'Gyro with rotors turning',
    purpose: 'Vibration that reaches the gyro.',
    tools: [
      'the craft strapped down on a heavy bench with soft feet as in flight',
      'speed log or tachometer',
    ],
    cautions: [
      'First without propellers: motors alone at idle. Only if that is calm, with propellers.',
      'With propellers: craft strapped down at two points that each hold its full thrust, nobody within its plane, ' +
        'clear area of 3 m.',
      EYES,
      CUT_OFF,
      BATTERY,
      RULES,
    ],
    steps: [
      'Log the gyro for 20 s with the motors at idle and a steady command; write down their speed.',
      'Again at a command as near to hover as the straps allow.',
      'If one corner is suspected, turn each motor alone.',
    ],
    fields: [
      field('file', '', 2),
      field('speed', 'rev/min', 2),
      field('blades', ''),
      field('rotors turning', ''),
    ],
    result: 'vibration lines with their rotor orders',
  },
];
