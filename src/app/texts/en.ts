/** English texts of the frame and its widgets. A language is one table of this shape; places bring their own. */
import type { PlaceName } from '../store/document.ts';

export const en = {
  title: 'Gustbench',
  skip: 'Skip to the place',
  rail: 'Places',
  places: {
    measure: 'Measure',
    shape: 'Shape',
    fly: 'Fly',
    prove: 'Prove',
    match: 'Match',
    carry: 'Carry',
  } satisfies Record<PlaceName, string>,
  aims: {
    measure: 'Bench measurements to a build',
    shape: 'Gains against the frequency response',
    fly: 'Hands on the sticks, in the wind',
    prove: 'Trials, sweeps and maps',
    match: 'A log of the real craft over the model',
    carry: 'The pre-flight sheet and the files',
  } satisfies Record<PlaceName, string>,
  waits: (what: string) => `waiting: ${what}`,
  topLine: {
    label: 'On the bench',
    craft: 'Craft',
    gains: 'Gains',
    side: 'Gain set',
    changed: 'changed since saved',
    changedMark: '●',
    wind: 'Wind',
    loop: 'Loop',
    work: 'Work',
    workHint: 'Crafts, gain sets, files, archive (Alt+W)',
    settings: 'Settings',
    help: 'Help',
    undo: (what: string | null) => (what === null ? 'Nothing to undo' : `Undo: ${what}`),
    redo: (what: string | null) => (what === null ? 'Nothing to redo' : `Redo: ${what}`),
    undoShort: 'Undo',
    redoShort: 'Redo',
    unnamed: 'unnamed',
  },
  offline: {
    failed: 'This browser did not keep Gustbench for offline use; it works while the network is there.',
    newVersion: 'A new version of Gustbench is ready.',
    take: 'Take it now',
    afterLanding: 'Motors are armed: take the new version after landing.',
  },
  save: {
    pending: 'saving …',
    saved: 'saved',
    off: 'not kept',
    failed: 'NOT SAVED',
    offLong: (reason: string) =>
      `Your work is not kept in this browser${reason === '' ? '' : `: ${reason}`}. Export an archive before you leave.`,
    failedLong: (reason: string) => `The last change could not be written down: ${reason}.`,
    exportNow: 'Export an archive',
    retry: 'Try again',
    quota: 'the browser has no room left for this page',
    later: 'the kept work belongs to a later version of Gustbench',
    silent: 'the browser’s storage did not answer',
    otherNewer: (name: string) =>
      `Another window changed “${name}” too. This window’s state stays; the other one is kept as a craft of its own.`,
    taken: (name: string) => `“${name}” was changed in another window; taken over here.`,
    aside: (name: string, why: string) =>
      `A stored record (${name}) could not be read and was put aside; everything else is here. ${why}`,
    asideNone: 'Records put aside',
    closedForUpdate: 'A later version of Gustbench is opening in another window. Reload this one to go on.',
  },
  jobs: {
    label: 'Background work',
    stop: 'Stop',
    stopNamed: (job: string) => `Stop: ${job}`,
    share: (share: number | null) => (share === null ? '…' : `${Math.floor(share * 100)} %`),
    left: (seconds: number | null) =>
      seconds === null
        ? ''
        : seconds < 90
          ? `${Math.ceil(seconds)} s left`
          : `${Math.ceil(seconds / 60)} min left`,
  },
  notices: {
    label: 'Messages',
    dismiss: 'Dismiss',
    refused: (file: string) => `${file} was not taken; what was there stays.`,
    more: (count: number) => `and ${count} more`,
  },
  edits: {
    byLink: 'craft from a link',
    saveGains: 'save gains',
    saveBuild: 'save build',
    copyToB: 'copy A to B',
    dropB: 'drop B',
    openFile: (name: string) => `open ${name}`,
    copyCraft: (name: string) => `copy ${name}`,
    removeCraft: (name: string) => `remove ${name}`,
    renameCraft: 'rename craft',
    recallGains: 'bring back saved gains',
    import: (name: string) => `import ${name}`,
  },
  states: {
    loading: 'Loading …',
    failedPlace: (place: string) => `${place} stopped working`,
    failedPlaceText: 'The other places go on and nothing is lost. The text below helps to mend it.',
    failedLoad: (place: string) => `${place} could not be loaded`,
    failedLoadText: 'The page may be offline, or a newer version was put in its place. Your work is kept.',
    tryAgain: 'Try again',
    reload: 'Reload the page',
    uncaught: 'Something went wrong inside the page. Your work is kept; if things look odd, reload.',
    copyError: 'Copy the error',
    copied: 'Copied',
    stale: 'Out of date',
    staleText: 'Computed for an earlier state of the build or gains.',
    recompute: 'Compute again',
  },
  wind: {
    calm: 'calm',
    light: 'light turbulence',
    gusty: 'gusty',
    rough: 'rough',
    gusts: (count: number) => (count === 1 ? '1 gust set' : `${count} gusts set`),
  },
  field: {
    limits: (min: string, max: string, unit: string) => `${min} to ${max}${unit === '' ? '' : ` ${unit}`}`,
    notNumber: (shown: string, limits: string) =>
      `“${shown}” is not a number from ${limits}; the old value stays`,
    outside: (shown: string, limits: string) => `${shown} is outside ${limits}; the old value stays`,
    fine: 'Arrow keys step, Shift for fine steps, double-click goes back to the saved value',
    saved: (value: string) => `saved: ${value}`,
  },
  drop: {
    hint: 'Drop a file here or choose one',
    choose: 'Choose a file',
    over: 'Let go to open it',
  },
  table: { empty: 'Nothing here yet', sortBy: (column: string) => `Sort by ${column}` },
  dialog: { close: 'Close' },
  plot: {
    cursorOf: (what: string) => `${what}: cursor`,
    keys: 'Arrow keys move the cursor, Shift sample by sample, Home and End to the ends, Escape takes it off',
    xyKeys:
      'Left and right arrows run along a curve, up and down change the curve, Shift for fine steps; the wheel zooms, double-click shows all',
    noData: 'Nothing to draw yet',
    unstable: 'unstable',
    pointOf: (what: string) => `${what}: point`,
    mapKeys: 'Arrow keys move the point, Shift for fine steps, Enter picks it',
    live: 'live',
    pausedAt: (time: string) => `at ${time}`,
    tapeKeys: 'Left and right arrows move in time, Shift for fine steps, End returns to live',
  },
  plan: {
    label: 'Plan of the craft: command per corner',
    corner: (corner: string, share: number, saturated: boolean) =>
      `${corner} ${Math.round(share * 100)} %${saturated ? ', saturated' : ''}`,
  },
  work: {
    title: 'Work',
    crafts: 'Crafts',
    name: 'Name',
    mass: 'Mass',
    gainsColumn: 'Gains',
    open: 'Put on the bench',
    onBench: 'on the bench',
    rename: 'Rename',
    copy: 'Copy',
    remove: 'Remove',
    files: 'Files',
    fileHint: 'Drop a build, gains, wind, scene or archive file here',
    saveBuildFile: 'Save build file',
    saveGainsFile: 'Save gains file',
    saveWindFile: 'Save wind file',
    exportArchive: 'Export everything as one archive',
    gainSets: (side: string) => `Gain set ${side}`,
    note: 'Note',
    noteHint: 'what changed and why',
    saveGains: 'Save these gains',
    saved: 'Saved sets, newest first',
    when: 'Saved',
    differs: 'Differs from the working set in',
    same: 'nothing',
    bringBack: 'Bring back',
    copyToB: 'Copy A to B',
    dropB: 'Drop B',
    aside: 'Put aside',
    asideText: 'Records that could not be read. They are kept until you remove them.',
    asideWhy: 'Why',
    asideSave: 'Save as file',
    asideRemove: 'Remove',
    newBuild: (name: string, shape: string) =>
      `${name} is on the bench with the gains that lay there; ${shape} proposes gains of its own.`,
  },
  archive: {
    byLink: (name: string) =>
      `“${name}” came from a link as a craft of its own; Undo takes it off the bench again.`,
    opened: (count: number) =>
      count === 1 ? '1 craft came from the archive.' : `${count} crafts came from the archive.`,
  },
  settings: {
    title: 'Settings',
    theme: 'Appearance',
    themes: { auto: 'as the system', light: 'light', dark: 'dark', contrast: 'high contrast' },
    units: 'Shown units',
    unitSystems: { metric: 'metric', imperial: 'feet, pounds, miles an hour' },
    motion: 'Movement',
    motions: { auto: 'as the system', on: 'reduced' },
  },
  help: {
    title: 'Help',
    intro:
      'Gustbench answers one question before a custom quadcopter leaves the ground: will these gains hold this craft, in this wind, with this gyro, in my hands?',
    caution:
      'A simulated pass is not a clearance to fly. Take propellers off for bench work, restrain the first hover, wear eye protection, keep the area clear and a kill switch at hand, treat batteries with care; local aviation rules and licensed practice come first.',
    path: 'From the demo to your own craft',
    steps: [
      'Fly: take the Sandpiper up with the keyboard; the keys stand beside the view.',
      'Shape: change one gain and read what the smallest margin says.',
      'Prove: run the trials with both gain sets.',
      'Measure: weigh, swing and test your own craft; each worksheet says how.',
      'Shape: ask for starting gains for it, then fly and prove it.',
      'Carry: print the pre-flight sheet and take the constants along.',
    ],
    keys: 'Keys',
    keyTable: [
      ['Alt + 1 … 6', 'Measure, Shape, Fly, Prove, Match, Carry'],
      ['Ctrl + Z', 'Undo'],
      ['Ctrl + Shift + Z', 'Redo'],
      ['Alt + W', 'Work: crafts, gain sets, files'],
      ['Alt + H', 'This help'],
      ['Alt + S', 'Settings'],
    ] as readonly (readonly [string, string])[],
  },
} as const;

/** A language's table: the shape of the English one. */
export type Texts = Widen<typeof en>;
type Widen<T> = T extends string
  ? string
  : T extends (...args: infer A) => string
    ? (...args: A) => string
    : T extends readonly (infer E)[]
      ? readonly Widen<E>[]
      : { readonly [K in keyof T]: Widen<T[K]> };
