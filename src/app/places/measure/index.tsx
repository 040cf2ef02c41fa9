/** Measure: bench measurements to a build, how well each is known always beside it; the build's own numbers. */
import { useState } from 'preact/hooks';
import { WORKSHEETS, type Worksheet } from '../../../measuring/worksheets.ts';
import { Button } from '../../widgets/Button.tsx';
import { Tabs } from '../../widgets/Tabs.tsx';
import { BalanceForm } from './BalanceForm.tsx';
import { Bench } from './Bench.tsx';
import type { BenchKind } from './kinds.ts';
import { BuildFields } from './BuildFields.tsx';
import './measure.css';
import { PartsForm } from './PartsForm.tsx';
import { measureTexts as words } from './texts.ts';

type Sheet = BenchKind | 'numbers' | 'balance' | 'parts';
const SHEETS: readonly Sheet[] = ['numbers', 'balance', 'parts', 'swing', 'stand', 'spinup', 'still'];
const PAPER: Readonly<Record<Sheet, readonly Worksheet['id'][]>> = {
  numbers: [],
  balance: ['balance'],
  parts: ['parts'],
  swing: ['swing-bifilar', 'swing-compound'],
  stand: ['stand'],
  spinup: ['spinup'],
  still: ['still-rest', 'still-idle'],
};

export default function Measure() {
  const [sheet, setSheet] = useState<Sheet>('numbers');
  return (
    <div class="measure">
      <Tabs
        label={words.sheets}
        value={sheet}
        tabs={SHEETS.map((value) => ({ value, label: words.tabs[value] }))}
        onChange={setSheet}
      >
        <Cautions sheet={sheet} />
        <SheetBody sheet={sheet} />
        <Papers sheet={sheet} />
      </Tabs>
    </div>
  );
}

function SheetBody(props: { sheet: Sheet }) {
  const { sheet } = props;
  if (sheet === 'numbers') return <BuildFields />;
  if (sheet === 'balance') return <BalanceForm />;
  if (sheet === 'parts') return <PartsForm />;
  return <Bench key={sheet} kind={sheet} />;
}

/** What can hurt in this measurement, before anything else. */
function Cautions(props: { sheet: Sheet }) {
  const papers = WORKSHEETS.filter((one) => PAPER[props.sheet].includes(one.id));
  const cautions = [...new Set(papers.flatMap((one) => one.cautions))];
  if (cautions.length === 0) return null;
  return (
    <ul class="measure-cautions" aria-label={words.cautions}>
      {cautions.map((one) => (
        <li key={one}>{one}</li>
      ))}
    </ul>
  );
}

function Papers(props: { sheet: Sheet }) {
  const papers = WORKSHEETS.filter((one) => PAPER[props.sheet].includes(one.id));
  return (
    <div class="measure-papers">
      {papers.map((paper) => (
        <details key={paper.id}>
          <summary>
            {words.worksheet}: {paper.title}
          </summary>
          <p>{paper.purpose}</p>
          <ol>
            {paper.steps.map((step) => (
              <li key={step}>{step}</li>
            ))}
          </ol>
          <Button onClick={() => print(paper)}>{words.print}</Button>
        </details>
      ))}
    </div>
  );
}

/** Prints one worksheet from a frame of its own, so that the page stays as it is. */
function print(paper: Worksheet): void {
  const frame = document.createElement('iframe');
  frame.style.display = 'none';
  frame.srcdoc = paperHtml(paper);
  frame.onload = () => {
    frame.contentWindow?.print();
    setTimeout(() => frame.remove(), 60_000);
  };
  document.body.append(frame);
}

function paperHtml(paper: Worksheet): string {
  const list = (tag: 'ol' | 'ul', items: readonly string[]) =>
    `<${tag}>${items.map((item) => `<li>${item}</li>`).join('')}</${tag}>`;
  const fields = paper.fields
    .map(
      (field) =>
        `<tr><td>${field.label}, ${field.unit}</td>${'<td class="box"></td>'.repeat(field.repeats)}</tr>`,
    )
    .join('');
  return `<!doctype html><meta charset="utf-8"><title>${paper.title}</title><style>body{font:12px/1.45 system-ui,sans-serif;margin:15mm}td{border-bottom:1px solid #999;padding:4px 8px}.box{min-width:60px;border:1px solid #000}.c{border:2px solid #000;padding:4px 8px}</style><h1>${paper.title}</h1><p>${paper.purpose}</p><div class="c">${list('ul', paper.cautions)}</div><h2>${words.tools}</h2>${list('ul', paper.tools)}<h2>${words.steps}</h2>${list('ol', paper.steps)}<table>${fields}</table><p>${paper.result}</p>`;
}
