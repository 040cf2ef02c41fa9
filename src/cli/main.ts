/** The command line: six verbs over the same core as the page. */
import { Command, CommanderError } from 'commander';
import { VERSION } from '../flight/record.ts';
import { addCarryCommand } from './carry.ts';
import { addFlyCommand } from './fly.ts';
import { BAD_INPUT } from './io.ts';
import { addMatchCommand } from './match.ts';
import { addMeasureCommand } from './measure.ts';
import { addProveCommand } from './prove.ts';
import { addShapeCommand } from './shape.ts';
import { serveTrialsIfWorker } from './trialPool.ts';

const VERBS = [
  addMeasureCommand,
  addShapeCommand,
  addFlyCommand,
  addProveCommand,
  addMatchCommand,
  addCarryCommand,
];

async function main(): Promise<void> {
  const program = new Command('gustbench')
    .description('Will these gains hold this craft? The flight bench from the shell.')
    .version(VERSION)
    .exitOverride()
    .configureOutput({ outputError: (text, write) => write(text.replace(/^error: /, 'command line: ')) });
  for (const add of VERBS) add(program);
  for (const command of program.commands) {
    command.exitOverride();
    for (const inner of command.commands) inner.exitOverride();
  }
  try {
    await program.parseAsync();
  } catch (error) {
    if (!(error instanceof CommanderError)) throw error;
    // commander has printed its line already; help and version end well.
    process.exitCode = error.exitCode === 0 ? 0 : BAD_INPUT;
  }
}

// A reader that has seen enough (head, less) closes the pipe: that is an end, not an error.
process.stdout.on('error', (error: NodeJS.ErrnoException) => {
  if (error.code !== 'EPIPE') throw error;
  process.exit(0);
});

if (!serveTrialsIfWorker()) await main();
