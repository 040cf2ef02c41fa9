/** Carry: the sheet as it will print, constants in the firmware's units, files and a link. */
import { useEffect, useMemo, useRef, useState } from 'preact/hooks';
import { assembleSheet, QUANTITY_NAMES, SHEET_TRIALS } from '../../../carrying/assemble.ts';
import { sheetHtml } from '../../../carrying/sheet.ts';
import { windFlights, windProof, windTask } from '../../../carrying/windLimit.ts';
import type { Build } from '../../../craft/build.ts';
import type { Gains } from '../../../craft/gains.ts';
import { InputError } from '../../../craft/problem.ts';
import {
  CONVENTIONS,
  exportConstants,
  EXPORTS,
  type Convention,
  type ExportKind,
} from '../../../shaping/conventions.ts';
import type { TrialTask } from '../../../trials/runTrial.ts';
import type { TrialResult } from '../../../trials/trial.ts';
import { fileStem, saveFile, saveJson } from '../../storage/saveFile.ts';
import { useStore } from '../../store/context.ts';
import type { Store } from '../../store/store.ts';
import { withUnit } from '../../store/units.ts';
import { Button } from '../../widgets/Button.tsx';
import { NoticeBox } from '../../widgets/Notice.tsx';
import { Select } from '../../widgets/Select.tsx';
import { keptShape } from '../shape/kept.ts';
import './carry.css';
import { flyForSheet, type SheetFlights } from './flights.ts';
import { carriedFor, isOutOfDate, joined, knownOnSheet, provenFor, type CarrySheet } from './kept.ts';
import { SheetView } from './SheetView.tsx';
import { linkFor } from './shareLink.ts';
import { carryTexts as words } from './texts.ts';

const ENDINGS: Readonly<Record<ExportKind, string>> = {
  c: 'h',
  cpp: 'hpp',
  json: 'constants.json',
  text: 'txt',
};
const SEED = 1;

/** What the sheet is made of. */
interface Carried {
  readonly build: Build;
  readonly gains: Gains;
  readonly convention: Convention;
  /** All that may be chosen. */
  readonly conventions: readonly Convention[];
  readonly own: CarrySheet;
  readonly results: readonly TrialResult[];
  readonly known: Readonly<Record<string, string>>;
}

export default function Carry() {
  const store = useStore();
  const carried = useCarried(store);
  const frame = useRef<HTMLIFrameElement>(null);
  const sheet = useMemo(
    () => madeSheet(carried),
    [carried.build, carried.gains, carried.convention, carried.own, carried.results, carried.known],
  );
  const stem = fileStem(carried.build.name);
  return (
    <div class="carry">
      <section class="carry-side">
        <p class="carry-caution">{words.caution}</p>
        <Flights carried={carried} />
        <OnSheet carried={carried} />
        <Select
          label={words.convention}
          value={carried.convention.name}
          options={carried.conventions.map(({ name }) => ({ value: name, label: name }))}
          onChange={(convention) => store.setPlaceMemory('carry', { convention })}
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
        <Files carried={carried} stem={stem} />
      </section>
      {sheet.problem === null ? (
        <SheetView html={sheet.html} title={words.sheet} frame={frame} />
      ) : (
        <NoticeBox kind="error">
          {words.cannot}: {sheet.problem}
        </NoticeBox>
      )}
    </div>
  );
}

function useCarried(store: Store): Carried {
  const build = store.build.value;
  const gains = store.gains.value;
  const { carry, prove, measure } = store.craft.value.sheets;
  const memory = store.settings.value.places.carry as { convention?: unknown } | undefined;
  const own = useMemo(() => carriedFor(carry, build, gains), [carry, build, gains]);
  const proven = useMemo(() => provenFor(prove, build, gains), [prove, build, gains]);
  const results = useMemo(() => joined(own.results, proven), [own, proven]);
  const known = useMemo(() => knownOnSheet(measure), [measure]);
  const conventions = conventionsOf(store.craft.value.sheets.shape);
  const convention = conventions.find((one) => one.name === memory?.convention) ?? CONVENTIONS[0];
  return { build, gains, convention, conventions, own, results, known };
}

/** The ones that come with the program and the craft's own from Shape, which goes before one of its name. */
function conventionsOf(shapeSheet: unknown): readonly Convention[] {
  const { own } = keptShape(shapeSheet);
  return own === null ? CONVENTIONS : [own, ...CONVENTIONS.filter((one) => one.name !== own.name)];
}

function madeSheet({ build, gains, convention, own, results, known }: Carried): {
  readonly html: string;
  readonly problem: string | null;
} {
  const printedAt = new Date().toISOString().slice(0, 10);
  try {
    const content = assembleSheet({ build, gains, convention, results, wind: own.wind, printedAt, known });
    return { html: sheetHtml(content), problem: null };
  } catch (error) {
    if (error instanceof InputError || error instanceof RangeError)
      return { html: '', problem: error.message };
    throw error;
  }
}

/** Starts what the sheet needs flown; results of a build and gains that changed meanwhile are dropped. */
function Flights(props: { carried: Carried }) {
  const store = useStore();
  const { build, gains } = props.carried;
  const [busy, setBusy] = useState(false);
  const run = useRef<SheetFlights | null>(null);
  useEffect(() => () => run.current?.cancel(), []);
  const fly = async (
    tasks: readonly TrialTask[],
    label: string,
    keep: (results: readonly (TrialResult | null)[]) => Partial<CarrySheet>,
  ): Promise<void> => {
    setBusy(true);
    run.current = flyForSheet(tasks, store.jobs, label);
    const results = await run.current.done.finally(() => setBusy(false));
    if (results === null || store.build.value !== build || store.gains.value !== gains) return;
    const now = carriedFor(store.craft.value.sheets.carry, build, gains);
    store.setSheet('carry', { ...now, ...keep(results) }, label);
  };
  const flights = windFlights(SEED);
  return (
    <div class="row">
      <Button
        primary
        disabled={busy}
        onClick={() =>
          void fly(
            SHEET_TRIALS.map((trial) => ({ trial, build, gains, wind: null, seed: SEED })),
            words.job,
            (results) => ({ results: results.filter((one) => one !== null) }),
          )
        }
      >
        {words.run}
      </Button>
      <Button
        disabled={busy}
        title={words.windHint(flights.length)}
        onClick={() =>
          void fly(
            flights.map((flight) => windTask(flight, build, gains)),
            words.windJob,
            (results) => ({ wind: windProof(flights, results) }),
          )
        }
      >
        {words.wind}
      </Button>
    </div>
  );
}

function OnSheet(props: { carried: Carried }) {
  const store = useStore();
  const { build, gains, own, results, known } = props.carried;
  const outside = results.filter((result) => !result.pass).length;
  const fromProve = results.length - own.results.length;
  const held = own.wind?.gust.held_mps ?? null;
  const lines = [
    words.trials(results.length, outside),
    ...(fromProve > 0 ? [words.fromProve(fromProve)] : []),
    own.wind === null
      ? words.windNone
      : words.windProven(held === null ? null : withUnit(held, 'm/s', store.settings.value.units)),
    words.knownCount(Object.keys(known).length, QUANTITY_NAMES.length),
    ...(isOutOfDate(store.craft.value.sheets.carry, build, gains) ? [words.outOfDate] : []),
  ];
  return (
    <div>
      <h2>{words.onSheet}</h2>
      <ul class="bare small carry-on-sheet">
        {lines.map((line) => (
          <li key={line}>{line}</li>
        ))}
      </ul>
    </div>
  );
}

function Files(props: { carried: Carried; stem: string }) {
  const store = useStore();
  const { build, gains, convention } = props.carried;
  const { stem } = props;
  const [said, setSaid] = useState('');
  const [link, setLink] = useState('');
  const saveConstants = (kind: ExportKind): void => {
    try {
      const text = exportConstants(gains, convention, kind, build.name);
      saveFile(`${stem}-gains.${ENDINGS[kind]}`, text, 'text/plain');
    } catch (error) {
      if (!(error instanceof RangeError)) throw error;
      store.notices.tell('error', error.message, { topic: 'carry:constants' });
    }
  };
  const copyLink = async (): Promise<void> => {
    const made = linkFor(location.href.split('#')[0], build, gains);
    setLink('');
    if (made === null) return setSaid(words.linkLong);
    try {
      await navigator.clipboard.writeText(made);
      setSaid(words.copied);
    } catch {
      setSaid(words.linkBlocked);
      setLink(made);
    }
  };
  return (
    <>
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
      {link === '' ? null : (
        <input class="text-input" type="text" readOnly aria-label={words.link} value={link} />
      )}
    </>
  );
}
