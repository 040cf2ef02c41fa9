// @vitest-environment happy-dom
import { signal } from '@preact/signals';
import { render } from 'preact';
import { useState } from 'preact/hooks';
import { act } from 'preact/test-utils';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { BenchContext } from '../../src/app/store/context.ts';
import { firstDocument } from '../../src/app/store/demos.ts';
import { Store } from '../../src/app/store/store.ts';
import { startTheme } from '../../src/app/store/theme.ts';
import { CornerPlan, type CornerReading } from '../../src/app/widgets/CornerPlan.tsx';
import { DataTable } from '../../src/app/widgets/DataTable.tsx';
import { NumberField, type NumberFieldProps } from '../../src/app/widgets/NumberField.tsx';
import { onGrid, parseNumber } from '../../src/app/widgets/numberText.ts';
import type { ComponentChildren } from 'preact';

let root: HTMLElement;
let store: Store;

beforeEach(() => {
  root = document.createElement('div');
  document.body.append(root);
  store = new Store(firstDocument());
});
afterEach(() => {
  render(null, root);
  root.remove();
});

async function show(children: ComponentChildren): Promise<void> {
  const bench = {
    store,
    theme: startTheme(store.settings),
    storage: null,
    running: new Map<string, unknown>(),
  };
  await act(() => render(<BenchContext.Provider value={bench}>{children}</BenchContext.Provider>, root));
}

function one<T extends Element>(selector: string, kind: new () => T): T {
  const found = root.querySelector(selector);
  if (!(found instanceof kind)) throw new Error(`no ${selector}`);
  return found;
}

const values: number[] = [];
function Field(props: Partial<NumberFieldProps>) {
  const [value, setValue] = useState(1);
  return (
    <NumberField
      label="Roll P"
      min={0}
      max={10}
      step={0.1}
      saved={2}
      {...props}
      value={value}
      onChange={(next) => {
        values.push(next);
        setValue(next);
      }}
    />
  );
}
const textField = () => one('input[type="text"]', HTMLInputElement);
const slider = () => one('input[type="range"]', HTMLInputElement);
async function key(target: Element, name: string, shiftKey = false): Promise<void> {
  await act(() => {
    target.dispatchEvent(
      new KeyboardEvent('keydown', { key: name, shiftKey, bubbles: true, cancelable: true }),
    );
  });
}
async function type(text: string): Promise<void> {
  const field = textField();
  await act(() => {
    field.value = text;
    field.dispatchEvent(new Event('input', { bubbles: true }));
  });
  await key(field, 'Enter');
}

describe('a number field', () => {
  beforeEach(() => {
    values.length = 0;
  });

  test('takes typed numbers, also with a comma', async () => {
    await show(<Field />);
    await type('3,25');
    expect(values).toEqual([3.25]);
    expect(textField().value).toBe('3.25');
  });

  test.each(['abc', '', '1 2', '11', '-1', '1e400', 'NaN'])(
    'says what is allowed for "%s" and keeps the old value',
    async (text) => {
      await show(<Field />);
      await type(text);
      expect(values).toEqual([]);
      expect(textField().value).toBe('1');
      expect(one('.message', HTMLElement).textContent).toContain('0 to 10');
      expect(textField().getAttribute('aria-invalid')).toBe('true');
      await type('4');
      expect(root.querySelector('.message')).toBeNull();
    },
  );

  test('steps by arrow keys, finely with Shift, and stops at its limits', async () => {
    await show(<Field />);
    await key(textField(), 'ArrowUp');
    await key(slider(), 'ArrowRight', true);
    await key(textField(), 'ArrowDown');
    expect(values).toEqual([1.1, 1.11, 1]);
    await type('10');
    await key(textField(), 'ArrowUp');
    expect(values.at(-1)).toBe(10);
  });

  test('goes back to the saved value by double-click', async () => {
    await show(<Field />);
    await act(() => {
      one('.field', HTMLElement).dispatchEvent(new Event('dblclick', { bubbles: true }));
    });
    expect(values).toEqual([2]);
  });

  test('shows and takes imperial units, keeps SI', async () => {
    store.changeSettings({ units: 'imperial' });
    await show(<Field unit="m" />);
    expect(textField().value).toBe('3.28084');
    await type('6.56168');
    expect(values[0]).toBeCloseTo(2, 6);
    await type('32.8084');
    expect(values[1]).toBeCloseTo(10, 6);
  });

  test('Escape takes back what was typed', async () => {
    await show(<Field />);
    await act(() => {
      textField().value = '7';
      textField().dispatchEvent(new Event('input', { bubbles: true }));
    });
    await key(textField(), 'Escape');
    expect(values).toEqual([]);
    expect(textField().value).toBe('1');
  });
});

describe('other widgets', () => {
  test('numbers as people type them', () => {
    expect(['1.5', '1,5', ' −3 ', '+2e-3', '.5', '5.'].map(parseNumber)).toEqual([
      1.5, 1.5, -3, 0.002, 0.5, 5,
    ]);
    expect(['', 'x', '1,2,3', '1.2.3', '0x10', '1e999', 'Infinity'].map(parseNumber)).toEqual(
      Array(7).fill(null),
    );
    expect(onGrid(0.30000000000000004, 0.1, 0)).toBe(0.3);
  });

  test('a table sorts by its heads, numbers as numbers', async () => {
    await show(
      <DataTable
        label="t"
        rows={[10, 9, 100]}
        rowKey={String}
        columns={[{ key: 'n', label: 'n', numeric: true, show: (n) => n, sortBy: (n) => n }]}
      />,
    );
    const cells = () => [...root.querySelectorAll('td')].map((cell) => cell.textContent);
    await act(() => one('button.sort', HTMLButtonElement).click());
    expect(cells()).toEqual(['9', '10', '100']);
    await act(() => one('button.sort', HTMLButtonElement).click());
    expect(cells()).toEqual(['100', '10', '9']);
    expect(one('th', HTMLElement).getAttribute('aria-sort')).toBe('descending');
  });

  test('the plan puts the corners where the build has them, and hatches what is saturated', async () => {
    const reading = signal<CornerReading>({ command: [0.5, 0.25, 0, 2], saturated: [0, 0, 0, 1] });
    await show(<CornerPlan build={store.build.value} reading={reading} />);
    const at = (n: number) => {
      const disc = root.querySelectorAll('.disc')[n];
      return [Number(disc.getAttribute('cx')), Number(disc.getAttribute('cy'))];
    };
    const [fl, fr, rl, rr] = [0, 1, 2, 3].map(at);
    expect([fl[0] < fr[0], fl[1] < rl[1], rr[0] > rl[0], rr[1] > fr[1]]).toEqual([true, true, true, true]);
    const shares = () => [...root.querySelectorAll('.corner-share')].map((text) => text.textContent);
    expect(shares()).toEqual(['50', '25', '0', '100']);
    const hatched = () =>
      [...root.querySelectorAll('.corner-hatch')].map((disc) => disc.getAttribute('opacity'));
    expect(hatched()).toEqual(['0', '0', '0', '1']);
    reading.value = { command: [0, 0, 0, 0], saturated: [1, 0, 0, 0] };
    expect([shares()[0], hatched()]).toEqual(['0', ['1', '0', '0', '0']]);
  });
});
