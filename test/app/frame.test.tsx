// @vitest-environment happy-dom
import { signal } from '@preact/signals';
import { render } from 'preact';
import { act } from 'preact/test-utils';
import { afterEach, beforeEach, describe, expect, test, vi } from 'vitest';
import { handleKey, type KeyActions } from '../../src/app/shell/keys.ts';
import { PlaceFrame } from '../../src/app/shell/PlaceFrame.tsx';
import { TopLine } from '../../src/app/shell/TopLine.tsx';
import { BenchContext } from '../../src/app/store/context.ts';
import { firstDocument } from '../../src/app/store/demos.ts';
import { Store } from '../../src/app/store/store.ts';
import { startTheme } from '../../src/app/store/theme.ts';
import type { ComponentType } from 'preact';

describe('a place that fails', () => {
  let root: HTMLElement;
  beforeEach(() => {
    root = document.createElement('div');
    document.body.append(root);
  });
  afterEach(() => {
    render(null, root);
    root.remove();
  });

  async function open(load: () => Promise<{ default: ComponentType }>): Promise<void> {
    const store = new Store(firstDocument());
    const bench = {
      store,
      theme: startTheme(store.settings),
      storage: null,
      running: new Map<string, unknown>(),
    };
    await act(() => {
      render(
        <BenchContext.Provider value={bench}>
          <PlaceFrame place={{ name: 'prove', key: '4', load }} />
        </BenchContext.Provider>,
        root,
      );
    });
    await act(() => Promise.resolve());
  }
  async function press(label: string): Promise<void> {
    const button = [...root.querySelectorAll('button')].find((one) => one.textContent === label);
    if (button === undefined) throw new Error(`no button ${label}`);
    await act(() => button.click());
    await act(() => Promise.resolve());
  }

  test('while drawing keeps the error to itself, shows it to copy, and can be tried again', async () => {
    const broken = signal(true);
    await open(() =>
      Promise.resolve({
        default: () => {
          if (broken.value) throw new Error('band without a number');
          return <p>all is well</p>;
        },
      }),
    );
    expect(root.textContent).toContain('Prove stopped working');
    expect(root.querySelector('pre')?.textContent).toContain('band without a number');
    broken.value = false;
    await press('Try again');
    expect(root.textContent).toBe('all is well');
  });

  test('to load says so and loads when tried again', async () => {
    let tries = 0;
    await open(() =>
      tries++ === 0
        ? Promise.reject(new Error('offline'))
        : Promise.resolve({ default: () => <p>all is well</p> }),
    );
    expect(root.textContent).toContain('could not be loaded');
    await press('Try again');
    expect(root.textContent).toBe('all is well');
  });
});

describe('the top line', () => {
  test('shows what is on the bench, marks unsaved gains, and stops background work', async () => {
    const root = document.createElement('div');
    const store = new Store(firstDocument());
    const bench = {
      store,
      theme: startTheme(store.settings),
      storage: null,
      running: new Map<string, unknown>(),
    };
    await act(() => {
      render(
        <BenchContext.Provider value={bench}>
          <TopLine open={() => undefined} />
        </BenchContext.Provider>,
        root,
      );
    });
    const item = (name: string) => root.querySelector(`[data-item="${name}"]`)?.textContent;
    expect([item('wind'), item('loop'), item('gains')]).toEqual([
      'Windcalm',
      'Loop400 Hz',
      'GainsSandpiper first set',
    ]);
    let stopped = 0;
    await act(() => {
      store.setGains((g) => ({ ...g, loop_Hz: 500 }), 'loop');
      store.setWind((w) => ({ ...w, mean_mps: 7 }), 'wind');
      store.jobs.start('map', () => stopped++).progress(0.25);
    });
    expect([item('wind'), item('loop'), item('gains')]).toEqual([
      'Wind7\u00a0m/s',
      'Loop500 Hz',
      'GainsSandpiper first set●',
    ]);
    expect(root.querySelector('.job')?.textContent).toContain('25 %');
    const stop = root.querySelector('[aria-label="Stop: map"]');
    if (!(stop instanceof HTMLButtonElement)) throw new Error('no stop');
    await act(() => stop.click());
    expect(stopped).toBe(1);
    render(null, root);
  });
});

describe('keys of the frame', () => {
  function pressed(init: KeyboardEventInit, target: EventTarget = document.body): string {
    const seen: string[] = [];
    const note = (name: string) => () => void seen.push(name);
    const actions: KeyActions = {
      place: (index) => void seen.push(`place ${index}`),
      undo: note('undo'),
      redo: note('redo'),
      help: note('help'),
      work: note('work'),
      settings: note('settings'),
    };
    const event = new KeyboardEvent('keydown', { cancelable: true, ...init });
    vi.spyOn(event, 'target', 'get').mockReturnValue(target);
    const taken = handleKey(event, actions);
    expect(event.defaultPrevented).toBe(taken);
    return seen.join();
  }

  test.each([
    [{ altKey: true, code: 'Digit1' }, 'place 0'],
    [{ altKey: true, code: 'Digit6' }, 'place 5'],
    [{ altKey: true, code: 'KeyH' }, 'help'],
    [{ ctrlKey: true, code: 'KeyZ' }, 'undo'],
    [{ metaKey: true, shiftKey: true, code: 'KeyZ' }, 'redo'],
    [{ ctrlKey: true, code: 'KeyY' }, 'redo'],
  ])('%j does %s', (init, what) => expect(pressed(init)).toBe(what));

  test('plain keys are left to flying and to fields', () => {
    for (const code of ['KeyW', 'KeyA', 'KeyS', 'KeyD', 'Digit1', 'Space', 'ArrowUp', 'KeyZ', 'KeyH']) {
      expect(pressed({ code })).toBe('');
      expect(pressed({ code, shiftKey: true })).toBe('');
    }
    // AltGr types signs: it comes as Ctrl and Alt together.
    expect(pressed({ altKey: true, ctrlKey: true, code: 'Digit2' })).toBe('');
  });

  test('undo in a text field is the field’s own; on a slider it is the bench’s', () => {
    const text = document.createElement('input');
    const slider = document.createElement('input');
    slider.type = 'range';
    expect(pressed({ ctrlKey: true, code: 'KeyZ' }, text)).toBe('');
    expect(pressed({ ctrlKey: true, code: 'KeyZ' }, slider)).toBe('undo');
  });
});
