/** One or two cells of a sweep: the numbers they set, their scores, their responses over each other. */
import { trialByName } from '../../../trials/registry.ts';
import { bandText } from '../../../trials/report.ts';
import { cellOverrides, cellTask } from '../../../trials/sweep.ts';
import type { SweepCells } from '../../../trials/sweepResult.ts';
import { nameOfPath, three, unitOfPath } from './shared.ts';
import type { Place } from './sweepView.ts';
import { proveTexts as words } from './texts.ts';
import { TracePlots } from './TracePlots.tsx';

export function CellCompare(props: { cells: SweepCells; picks: readonly Place[] }) {
  const { cells, picks } = props;
  const { sweep, subject } = cells;
  const set = picks.map((place) => cellOverrides(sweep, place));
  const results = picks.map(({ column, row }) => cells.at(column, row));
  const scores = trialByName(sweep.trial).scores;
  const two = picks.length === 2;
  return (
    <section class="prove-compare" aria-label={words.compare}>
      <h3>{words.compare}</h3>
      {!two && <p class="faint small">{words.compareHint}</p>}
      <table class="prove-scores">
        <thead>
          <tr>
            <th />
            {picks.map((_, i) => (
              <th key={i}>{words.picked(i + 1)}</th>
            ))}
            {two && <th>{words.cellDifference}</th>}
            <th>{words.band}</th>
          </tr>
        </thead>
        <tbody>
          {Object.keys(set[0]).map((path) => (
            <tr key={path}>
              <th scope="row" title={path}>
                {nameOfPath(path)}
              </th>
              {set.map((overrides, i) => (
                <td key={i}>
                  {three(overrides[path])} <span class="unit">{unitOfPath(path)}</span>
                </td>
              ))}
              {two && <td>{three(set[1][path] - set[0][path])}</td>}
              <td />
            </tr>
          ))}
          {scores.map(({ name, unit, band }, k) => {
            const values = results.map((cell) => cell?.values[k] ?? null);
            const [first, second] = values;
            return (
              <tr key={name}>
                <th scope="row">{name}</th>
                {values.map((value, i) => (
                  <td key={i}>
                    {results[i] === null ? words.notFlown : three(value)} <span class="unit">{unit}</span>
                  </td>
                ))}
                {two && <td>{first === null || second === null ? '—' : three(second - first)}</td>}
                <td class="faint">{bandText(sweep.bands[name] ?? band, unit)}</td>
              </tr>
            );
          })}
          <tr>
            <th />
            {results.map((cell, i) => (
              <td key={i} class={cell === null || cell.pass ? '' : 'bad'}>
                {cell === null ? '' : (cell.reason ?? (cell.pass ? words.within : words.outside))}
              </td>
            ))}
            {two && <td />}
            <td />
          </tr>
        </tbody>
      </table>
      <h3>{words.responses}</h3>
      <TracePlots
        flights={picks.map((place, i) => ({
          label: words.picked(i + 1),
          task: cellTask(sweep, subject, place),
        }))}
      />
    </section>
  );
}
