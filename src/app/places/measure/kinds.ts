/** What is measured from files. */
export type BenchKind = 'swing' | 'stand' | 'spinup' | 'still';
