import type { ComponentChildren } from 'preact';
import { Fragment } from 'preact';
import { useState } from 'preact/hooks';
import { useStore } from '../store/context.ts';

export interface Column<Row> {
  readonly key: string;
  readonly label: string;
  /** Shown beside the label in lighter ink. */
  readonly unit?: string;
  readonly numeric?: boolean;
  readonly show: (row: Row) => ComponentChildren;
  /** Makes the column sortable. */
  readonly sortBy?: (row: Row) => number | string;
}

export interface DataTableProps<Row> {
  /** Says what the table holds; the screen reader's caption. */
  readonly label: string;
  readonly columns: readonly Column<Row>[];
  readonly rows: readonly Row[];
  readonly rowKey: (row: Row) => string;
  /** Key of the row that is marked as chosen. */
  readonly chosen?: string | null;
  /** Key of the row that shows its inside below it. */
  readonly opened?: string | null;
  readonly inside?: (row: Row) => ComponentChildren;
  /** In place of "Nothing here yet". */
  readonly empty?: ComponentChildren;
}

/** Rows of numbers; columns with `sortBy` sort by a press on their head. */
export function DataTable<Row>(props: DataTableProps<Row>) {
  const words = useStore().texts.table;
  const [sort, setSort] = useState<{ key: string; down: boolean } | null>(null);
  const by = props.columns.find(({ key }) => key === sort?.key)?.sortBy;
  const rows = by === undefined ? props.rows : sorted(props.rows, by, sort?.down === true);
  return (
    <div class="table-scroll">
      <table class="table">
        <caption class="visually-hidden">{props.label}</caption>
        <thead>
          <tr>
            {props.columns.map(({ key, label, unit, numeric, sortBy }) => {
              const here = sort?.key === key;
              return (
                <th
                  key={key}
                  scope="col"
                  class={numeric ? 'numeric' : undefined}
                  aria-sort={here ? (sort.down ? 'descending' : 'ascending') : undefined}
                >
                  {sortBy === undefined ? (
                    label
                  ) : (
                    <button
                      type="button"
                      class="sort"
                      onClick={() => setSort({ key, down: here && !sort.down })}
                    >
                      {label}
                      <span aria-hidden="true">{here ? (sort.down ? ' ↓' : ' ↑') : ''}</span>
                    </button>
                  )}
                  {unit === undefined ? null : <span class="unit"> {unit}</span>}
                </th>
              );
            })}
          </tr>
        </thead>
        <tbody>
          {rows.map((row) => {
            const key = props.rowKey(row);
            return (
              <Fragment key={key}>
                <tr class={key === props.chosen ? 'chosen' : undefined}>
                  {props.columns.map((column) => (
                    <td key={column.key} class={column.numeric ? 'numeric' : undefined}>
                      {column.show(row)}
                    </td>
                  ))}
                </tr>
                {key === props.opened && props.inside !== undefined ? (
                  <tr class="inside">
                    <td colSpan={props.columns.length}>{props.inside(row)}</td>
                  </tr>
                ) : null}
              </Fragment>
            );
          })}
        </tbody>
      </table>
      {rows.length === 0 ? <div class="table-empty faint">{props.empty ?? words.empty}</div> : null}
    </div>
  );
}

function sorted<Row>(rows: readonly Row[], by: (row: Row) => number | string, down: boolean): Row[] {
  const direction = down ? -1 : 1;
  return [...rows].sort((a, b) => {
    const x = by(a);
    const y = by(b);
    return (
      direction *
      (typeof x === 'number' && typeof y === 'number' ? x - y : String(x).localeCompare(String(y)))
    );
  });
}
