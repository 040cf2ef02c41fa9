/** English texts of Carry. */
export const carryTexts = {
  sheet: 'Pre-flight sheet',
  print: 'Print or save as PDF',
  save: 'Save as HTML',
  run: 'Run the sheet’s trials',
  job: 'Trials for the sheet',
  convention: 'Gain convention',
  constants: 'Constants',
  files: 'Files',
  saveBuild: 'Build',
  saveGains: 'Gains',
  saveAs: { c: 'C header', cpp: 'C++ header', json: 'JSON', text: 'plain text' },
  link: 'Copy a link with build and gains',
  linkText: 'The link holds both after its #; nothing leaves this machine until you send it.',
  linkLong: 'Build and gains are too long for a link; send the files.',
  copied: 'Copied.',
  caution:
    'Before power goes to real motors: propellers off, eye protection, clear area, kill switch tried, battery sound. First hover restrained. A simulated pass is not clearance to fly; local aviation rules and licensed practice come first.',
  cannot: 'No sheet',
} as const;
