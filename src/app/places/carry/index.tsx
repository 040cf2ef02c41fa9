/** Carry: the sheet as it will print, constants in the firmware's units, files and a link. */
import { useEffect, useMemo, useRef, useState } from 'preact/hooks';
import { assembleSheet, SHEET_TRIALS } from '../../../carrying/assemble.ts';
import { sheetHtml } from '../../../carrying/sheet.ts';
import { InputError } from '../../../craft/problem.ts';
import { CONVENTIONS, exportConstants, EXPORTS, type ExportKind } from '../../../shaping/conventions.ts';
import { runPool, type PoolRun } from '../../../trials/pool.ts';
import type { TrialResult } from '../../../trials/trial.ts';
import { fileStem, saveFile, saveJson } from '../../storage/saveFile.ts';
import { useStore } from '../../store/context.ts';
import { Button } from '../../widgets/Button.tsx';
import { NoticeBox } from '../../widgets/Notice.tsx';
import { Select } from '../../widgets/Select.tsx';
import { webWorker, workerCount } from '../prove/browserPool.ts';
import './carry.css';
import { linkFor } from './shareLink.ts';
import { carryTexts as words } from './texts.ts';

const ENDINGS: Readonly<Record<ExportKind, string>> = {
  c: 'h',
  cpp: 'hpp',
  json: 'constants.json',
  text: 'txt',
};
const SEED = 1;

export default function Carry() {
  const store = useStore();
  const build = store.build.value;
  const gains = store.gains.value;
  const [name, setName] = useState(CONVENTIONS[0].name);
  const [results, setResults] = useState<readonly TrialResult[]>([]);
  const [busy, setBusy] = useState(false);
  const [said, setSaid] = useState('');
  const run = useRef<PoolRun | null>(null);
  const frame = useRef<HTMLIFrameElement>(null);
  const convention = CONVENTIONS.find((one) => one.name === name) ?? CONVENTIONS[0];
  // Results are of one build and gain set; another set's must not stand on this sheet.
  useEffect(() => setResults([]), [build, gains]);
  useEffect(() => () => run.current?.cancel(), []);
  const sheet = useMemo(() => {
    try {
      return {
        html: sheetHtml(
          assembleSheet({
            build,
            gains,
            convention,
            results,
            seed: SEED,
            printedAt: new Date().toISOString().slice(0, 10),
          }),
        ),
        problem: null,
      };
    } catch (error) {
      if (error instanceof InputError || error instanceof RangeError)
        return { html: '', problem: error.message };
      throw error;
    }
  }, [build, gains, convention, results]);

  const runTrials = (): void => {
    const workers = Array.from({ length: workerCount() }, webWorker);
    const found = new Array<TrialResult | null>(SHEET_TRIALS.length).fill(null);
    const job = store.jobs.start(words.job, () => run.current?.cancel());
    let done = 0;
    setBusy(true);
    run.current = runPool(
      workers,
      SHEET_TRIALS.length,
      (index) => ({ trial: SHEET_TRIALS[index], build, gains, wind: null, seed: SEED }),
      (index, answer) => {
        done++;
        job.progress(done / SHEET_TRIALS.length);
        if (answer.kind === 'done') found[index] = answer.result;
      },
    );
    void run.current.done.then(() => {
      workers.forEach((worker) => worker.end());
      job.end();
      setBusy(false);
      if (store.build.value === build && store.gains.value === gains)
        setResults(found.filter((one) => one !== null));
    });
  };
  const stem = fileStem(build.name);
  const saveConstants = (kind: ExportKind): void => {
    try {
      saveFile(
        `${stem}-gains.${ENDINGS[kind]}`,
        exportConstants(gains, convention, kind, build.name),
        'text/plain',
      );
    } catch (error) {
      if (!(error instanceof RangeError)) throw error;
      store.notices.tell('error', error.message, { topic: 'carry:constants' });
    }
  };
  const copyLink = async (): Promise<void> => {
    const link = linkFor(location.href.split('#')[0], build, gains);
    if (link === null) setSaid(words.linkLong);
    else {
      await navigator.clipboard.writeText(link);
      setSaid(words.copied);
    }
  };
  return (
    <div class="carry">
      <section class="carry-side">
        <p class="carry-caution">{words.caution}</p>
        <Button primary disabled={busy} onClick={runTrials}>
          {words.run}
        </Button>
        <Select
          label={words.convention}
          value={name}
          options={CONVENTIONS.map((one) => ({ value: one.name, label: one.name }))}
          onChange={setName}
        />
        <div class="row">
          <Button disabled={sheet.problem !== null} onClick={() => frame.current?.contentWindow?.print()}>
            {words.print}
          </Button>
          <Button
            disabled={sheet.problem !== null}
            onClick={() => saveFile(`${stem}-sheet.html`, sheet.html, 'text/html')}
          >
            {words.save}
          </Button>
        </div>
        <h2>{words.constants}</h2>
        <div class="row">
          {EXPORTS.map((kind) => (
            <Button key={kind} onClick={() => saveConstants(kind)}>
              {words.saveAs[kind]}
            </Button>
          ))}
        </div>
        <h2>{words.files}</h2>
        <div class="row">
          <Button onClick={() => saveJson(`${stem}.build.json`, build)}>{words.saveBuild}</Button>
          <Button onClick={() => saveJson(`${stem}.gains.json`, gains)}>{words.saveGains}</Button>
          <Button onClick={() => void copyLink()}>{words.link}</Button>
        </div>
        <p class="small faint">{words.linkText}</p>
        <p role="status">{said}</p>
      </section>
      {sheet.problem === null ? (
        <iframe ref={frame} class="carry-sheet" title={words.sheet} srcdoc={sheet.html} />
      ) : (
        <NoticeBox kind="error">
          {words.cannot}: {sheet.problem}
        </NoticeBox>
      )}
    </div>
  );
}
