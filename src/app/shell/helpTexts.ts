/** English texts of the manual: what each place is for and how to work there. Read in Help, beside its picture. */
import type { PlaceName } from '../store/document.ts';

export interface PlaceHelp {
  readonly what: string;
  readonly steps: readonly string[];
  /** What is easily overlooked. */
  readonly mind: string;
  /** What the picture shows, for those who do not see it. */
  readonly picture: string;
}

export const helpTexts = {
  here: (place: string) => `Here: ${place}`,
  manual: 'The other places',
  startGuide: 'Start the guide',
  resumeGuide: 'Show the guide',
  mind: 'Mind:',
} as const;

export const PLACE_HELP: Readonly<Record<PlaceName, PlaceHelp>> = {
  measure: {
    what: 'Turns what a scale, a string, a stopwatch and a thrust stand say into the build: the numbers that the simulation flies.',
    steps: [
      'Begin with the numbers of the build: all-up mass, propeller, motor, battery, ESC, gyro. Every field says its unit and its limits.',
      'Swing test: hang the craft on two wires or as a pendulum and time some swings a few times. Inertia comes out with how well it is known.',
      'Thrust stand: give the file as it is; columns and units are read from its heads. Coefficients, their change with speed and the motor’s constants come out.',
      'Spin-up and gyro at rest give the motor’s lag and the sensor’s noise.',
      'Accept takes a result into the build; undo takes it out again.',
    ],
    mind: 'Propellers off for everything that needs none. A thrust stand is guarded, bolted down and run from a distance, with eye protection on.',
    picture: 'Measure: the worksheet of a swing test with its cautions and its form',
  },
  shape: {
    what: 'Gains with the loop in view: how much margin each one leaves, how the craft answers a step and a gust, what noise reaches the motors.',
    steps: [
      'Change a gain with its slider, its field or the arrow keys (Shift for fine steps). Double-click brings the saved value back.',
      'Read the sentence about the smallest margin first; the table and the plots say why.',
      'Propose starting gains when there are none: limits that held them back are named.',
      'Put a second set in B to see both in every plot.',
      'Firmware units shows the same gains as your firmware counts them, and what changes with the loop rate.',
    ],
    mind: 'The linear model knows no saturation and no wind: a set that looks good here still has to fly and to be proven.',
    picture: 'Shape: gain fields, the table of margins, Bode, Nyquist, sensitivity and step plots',
  },
  fly: {
    what: 'Your build in real time, by keyboard, gamepad, transmitter on USB or touch, with gains and wind that change in flight.',
    steps: [
      'Space arms, the climb key lifts. Self-levelling and height hold are on for keys.',
      'The panel at the side changes gains, filters, noise, wind and faults while you fly.',
      'The tape keeps every tick: drag it back, then fly on from there.',
      'Sound makes noise in the motors audible. A mark says when a motor has nothing left to give.',
      'Save the record to look at it elsewhere or to give it to Match.',
    ],
    mind: 'Sticks from a transmitter fly without help, as the real craft would. Calibrate them first.',
    picture: 'Fly: the craft at the estuary bridge, the plan of its corners, the tape of rates and commands',
  },
  prove: {
    what: 'The same flights again and again: steps, gusts, turbulence, faults. Scores with bands say what held and what did not.',
    steps: [
      'Run all trials, or one. A row opens to its scores and to where each band comes from.',
      'With a set B beside A both fly through the same gusts.',
      'The map fills from coarse to fine: see how far you are from the edge in two gains at once.',
      'Spread flies the build as it might be, within what your measurements leave open.',
    ],
    mind: 'A pass is about this build in this wind on this seed. It is not clearance to fly.',
    picture: 'Prove: the table of trials, what each is for, some with their results',
  },
  match: {
    what: 'Lays the simulation over a log of the real craft and corrects the model from it.',
    steps: [
      'Drop a log as CSV; say which column is what where it cannot be told.',
      'Read which pieces were used and how sure each result is. An axis that was not moved has no numbers and says so.',
      'Take the corrected build when the difference is believable; then look at the gains again.',
    ],
    mind: 'Excite an axis gently, high enough, in calm air. A log of a smooth hover tells nothing about gain or lag.',
    picture: 'Match: the field for a log, and what makes a log worth having',
  },
  carry: {
    what: 'What leaves the screen: the pre-flight sheet, constants in your firmware’s units, build and gains as files or in a link.',
    steps: [
      'Run the sheet’s trials; results from Prove of the same build and gains are on it already.',
      'Prove the wind limit: gusts of rising speed from four sides and turbulence of rising level, over several seeds.',
      'Choose the gain convention, print or save as PDF: two pages, black on white.',
      'Work (Alt+W) holds crafts, the history of gain sets with notes, and one archive of everything.',
    ],
    mind: 'The sheet names what was not tested. Propellers off for the first power-up, restrained first hover, eye protection, clear area, kill switch tried, sound battery; local rules and licensed practice come first.',
    picture: 'Carry: the pre-flight sheet as it will print',
  },
};
