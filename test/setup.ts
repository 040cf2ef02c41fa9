/**
 * Property tests draw the same cases in every run, so that a failure is of the change and not of the day.
 * `FC_SEED=random` (or a number) draws others: run it now and then, and keep what it finds as an example.
 */
import fc from 'fast-check';

const given = process.env.FC_SEED;
const seed = given === undefined ? 20_261_201 : given === 'random' ? Date.now() % 2 ** 31 : Number(given);
fc.configureGlobal({ seed });
