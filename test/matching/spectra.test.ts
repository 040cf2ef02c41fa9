import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { unitResponse } from '../../src/matching/plantResponse.ts';
import { coherence, crossSpectra, measuredResponse } from '../../src/matching/spectra.ts';

/** SciPy 1.10: signal.welch, csd, coherence, cont2discrete; see spectra_and_response.py. */
const scipy = JSON.parse(
  readFileSync(new URL('../reference/matching/spectra_and_response.json', import.meta.url), 'utf8'),
) as {
  fs: number;
  nperseg: number;
  x: number[];
  y: number[];
  f: number[];
  pxx: number[];
  pyy: number[];
  pxyRe: number[];
  pxyIm: number[];
  coherence: number[];
  plant: {
    T: number;
    K: number;
    tau: number;
    delay_ticks: number;
    u: number[];
    cases: { lead_s: number; damping_per_s: number; rate_dps: number[] }[];
  };
};

function expectSame(found: ArrayLike<number>, wanted: readonly number[], name: string): void {
  expect(found.length, name).toBe(wanted.length);
  const largest = Math.max(...wanted.map(Math.abs));
  wanted.forEach((value, k) => {
    expect(Math.abs(found[k] - value), `${name} at ${k}`).toBeLessThan(1e-9 * largest);
  });
}

describe('spectra against SciPy', () => {
  const s = crossSpectra([[scipy.x, scipy.y]], scipy.fs, scipy.nperseg);

  it('densities, cross density and coherence are those of scipy.signal', () => {
    expectSame(s.f_Hz, scipy.f, 'f');
    expectSame(s.auto[0], scipy.pxx, 'Pxx');
    expectSame(s.auto[1], scipy.pyy, 'Pyy');
    expectSame(s.crossRe[0], scipy.pxyRe, 'Re Pxy');
    expectSame(s.crossIm[0], scipy.pxyIm, 'Im Pxy');
    expectSame(coherence(s, 0, 1), scipy.coherence, 'coherence');
  });

  it('the response is Pxy/Pxx and trusted where the coherence is above 0.6 (Tischler & Remple)', () => {
    const response = measuredResponse(s);
    expectSame(
      response.re,
      scipy.pxyRe.map((value, k) => value / scipy.pxx[k]),
      'Re H',
    );
    scipy.coherence.forEach((gamma, k) => {
      if (k > 0) expect(response.trusted[k], `bin ${k}`).toBe(gamma > 0.6 ? 1 : 0);
    });
    expect(response.trusted.some((value) => value === 0)).toBe(true);
  });
});

describe('plant response to a held command against SciPy', () => {
  const { T, K, tau, delay_ticks, u, cases } = scipy.plant;
  const piece = {
    t_s: Float64Array.from(u, (_, k) => k * T),
    u_us: Float64Array.from(u),
    y_dps: new Float64Array(u.length),
    uError_us: new Float64Array(u.length),
  };
  it.each(cases)('lead $lead_s s, damping $damping_per_s /s: cont2discrete', (one) => {
    const shape = {
      lag_s: tau,
      delay_s: delay_ticks * T,
      lead_s: one.lead_s,
      damping_per_s: one.damping_per_s,
    };
    const out = new Float64Array(u.length);
    unitResponse(piece, shape, 0, out);
    const largest = Math.max(...one.rate_dps.map(Math.abs));
    // The first row stands for rest; the lead shows from the second on.
    for (let k = 1; k < u.length; k++) {
      expect(Math.abs(K * out[k] - one.rate_dps[k]), `row ${k}`).toBeLessThan(1e-7 * largest);
    }
  });

  it('a delay between ticks lies between those of its neighbours, and rows that are left out change nothing', () => {
    const at = (delay_s: number, of = piece) => {
      const out = new Float64Array(of.t_s.length);
      unitResponse(of, { lag_s: tau, delay_s, lead_s: 0, damping_per_s: 0 }, 0, out);
      return out;
    };
    const half = at(2.5 * T);
    // Closed form: a step of 1 µs at t = 0 after a delay d gives (t−d) − τ(1 − e^(−(t−d)/τ)).
    const step = { ...piece, u_us: piece.u_us.map((_, k) => (k === 0 ? 0 : 1)) };
    const out = at(2.5 * T, step);
    for (const k of [10, 60, 200]) {
      const since = (k - 1) * T - 2.5 * T;
      expect(out[k]).toBeCloseTo(since - tau * (1 - Math.exp(-since / tau)), 10);
    }
    // Fewer instants, same command (held): the same rates there.
    const held = { ...piece, u_us: piece.u_us.map((_, k) => piece.u_us[k - (k % 2)]) };
    const kept = (a: Float64Array) => a.filter((_, k) => k % 2 === 0);
    const thin = {
      t_s: kept(held.t_s),
      u_us: kept(held.u_us),
      y_dps: kept(held.y_dps),
      uError_us: kept(held.uError_us),
    };
    const [full, few] = [at(1.3 * T, held), at(1.3 * T, thin)];
    few.forEach((value, i) => {
      expect(value).toBeCloseTo(full[2 * i], 8);
    });
    expect(half.every(Number.isFinite)).toBe(true);
  });
});
