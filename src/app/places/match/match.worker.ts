/** Log to identified plant, corrected build and replay, beside the page. The log that was read last is kept. */
import type { Build } from '../../../craft/build.ts';
import { InputError } from '../../../craft/problem.ts';
import type { FlightLog } from '../../../matching/log.ts';
import { matchLog } from '../../../matching/matchLog.ts';
import { blobSource, openLog, readLog } from '../../../matching/readLog.ts';
import { replayLog } from '../../../matching/replay.ts';
import type { FromMatchWorker, LogChoice, ToMatchWorker } from './messages.ts';
import { shownMatch } from './shown.ts';

/** Reading takes most of the time of a long log, the fit that of a short one. */
const READING_SHARE = 0.5;

const say = (message: FromMatchWorker): void => self.postMessage(message);

class MatchBench {
  private log: FlightLog | null = null;

  async answer(data: ToMatchWorker): Promise<void> {
    if (data.kind === 'inspect') {
      say({ kind: 'proposal', proposal: await openLog(blobSource(data.file, data.file.name)) });
    } else if (data.kind === 'match') await this.match(data);
    else await this.replay(data);
  }

  private async read(file: File, choice: LogChoice, build: Build): Promise<FlightLog> {
    this.log = null;
    const source = blobSource(file, file.name);
    const proposal = await openLog(source);
    this.log = await readLog(source, proposal, choice.columns, {
      range: build.esc,
      onProgress: (share) => say({ kind: 'progress', share: READING_SHARE * share, doing: 'reading' }),
    });
    return this.log;
  }

  private async match({ file, choice, build }: Extract<ToMatchWorker, { kind: 'match' }>): Promise<void> {
    const log = await this.read(file, choice, build);
    const result = matchLog(log, build, {
      ...(choice.loop_Hz === null ? {} : { loop_Hz: choice.loop_Hz }),
      onProgress: (share) =>
        say({ kind: 'progress', share: READING_SHARE + (1 - READING_SHARE) * share, doing: 'matching' }),
    });
    say({ kind: 'matched', result: shownMatch(log, build, result) });
  }

  private async replay(data: Extract<ToMatchWorker, { kind: 'replay' }>): Promise<void> {
    const { builds, gains, from_s, to_s } = data;
    const log = this.log ?? (await this.read(data.file, data.choice, builds[0]));
    const replays = builds.map((build, i) =>
      replayLog(log, build, gains, {
        from_s,
        to_s,
        onProgress: (share) => say({ kind: 'progress', share: (i + share) / builds.length, doing: 'flying' }),
      }),
    );
    say({ kind: 'replayed', replays });
  }
}

const bench = new MatchBench();

self.onmessage = ({ data }: MessageEvent<ToMatchWorker>) => {
  void bench.answer(data).catch((error: unknown) => {
    if (error instanceof InputError) say({ kind: 'refused', file: error.file, problems: error.problems });
    else if (error instanceof RangeError) {
      const problem = { path: 'build', value: error.message, allowed: 'a build that can hover' };
      say({ kind: 'refused', file: 'build', problems: [problem] });
    } else say({ kind: 'broken', text: error instanceof Error ? error.message : String(error) });
  });
};
