/** English texts of Carry. */
export const carryTexts = {
  sheet: 'Pre-flight sheet',
  print: 'Print or save as PDF',
  save: 'Save as HTML',
  run: 'Run the sheet’s trials',
  job: 'Trials for the sheet',
  wind: 'Prove the wind limit',
  windHint: (flights: number) =>
    `${flights} flights: gusts of rising speed from four sides, turbulence of rising level, each over several seeds`,
  windJob: 'Wind limit for the sheet',
  onSheet: 'On the sheet',
  trials: (count: number, outside: number) =>
    count === 0
      ? 'no trial yet'
      : `${count} ${count === 1 ? 'trial' : 'trials'}, ${outside === 0 ? 'all within their bands' : `${outside} OUTSIDE`}`,
  fromProve: (count: number) => `${count} of them from Prove`,
  windProven: (held_mps: string | null) =>
    held_mps === null ? 'wind limit: held not even the least gust' : `wind limit: gusts up to ${held_mps}`,
  windNone: 'wind limit not flown',
  knownCount: (count: number, all: number) =>
    `${count} of ${all} quantities with an uncertainty from Measure`,
  outOfDate: 'Earlier results were of another build or other gains and are left off.',
  convention: 'Convention',
  constants: 'Constants',
  files: 'Files',
  saveBuild: 'Build',
  saveGains: 'Gains',
  saveAs: { c: 'C header', cpp: 'C++ header', json: 'JSON', text: 'plain text' },
  link: 'Copy a link with build and gains',
  linkText: 'The link holds both after its #; nothing leaves this machine until you send it.',
  linkLong: 'Build and gains are too long for a link; send the files.',
  linkBlocked: 'The browser did not let the link be copied; it stands here:',
  copied: 'Copied.',
  caution:
    'Before power goes to real motors: propellers off, eye protection, clear area, kill switch tried, battery sound. First hover restrained. A simulated pass is not clearance to fly; local aviation rules and licensed practice come first.',
  cannot: 'No sheet',
} as const;
