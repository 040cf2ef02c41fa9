import { describe, expect, it } from 'vitest';
import { AXES } from '../../src/craft/gains.ts';
import { parseColumns } from '../../src/matching/columns.ts';
import { excitationTable, parseExcitation, suggestedExcitations } from '../../src/matching/excitation.ts';
import { matchLog } from '../../src/matching/matchLog.ts';
import { blobSource, openLog, readLog } from '../../src/matching/readLog.ts';
import { demoBuild } from '../physics/builds.ts';
import { multisine } from './closedLoop.ts';
import { asLog, flyThreeAxes, FOREIGN_COLUMNS, foreignCsv, ownCsv, PLANTS } from './logs.ts';

const build = demoBuild('sandpiper');

/** Known plants flown in closed loop with noise, gusts, 0.2 ms jitter and 1 % lost samples. */
function expectRecovered(result: ReturnType<typeof matchLog>): void {
  for (const axis of AXES) {
    const { estimates } = result.axes[axis];
    expect(estimates, axis).not.toBeNull();
    if (estimates === null) continue;
    const truth = PLANTS[axis];
    expect(
      Math.abs(estimates.gain_dps2_per_us.value / truth.gain_dps2_per_us - 1),
      `${axis} gain`,
    ).toBeLessThan(0.03);
    expect(Math.abs(estimates.lag_s.value / truth.lag_s - 1), `${axis} lag`).toBeLessThan(0.08);
    expect(Math.abs(estimates.delay_s.value - truth.delay_s), `${axis} delay, s`).toBeLessThan(0.0007);
    // Each interval holds its truth (three sigma here: one run may miss two).
    expect(Math.abs(estimates.gain_dps2_per_us.value - truth.gain_dps2_per_us)).toBeLessThan(
      3.5 * estimates.gain_dps2_per_us.sigma,
    );
  }
}

describe('identification in closed loop, truth known by construction', () => {
  it('gives back gain, lag and delay of three axes', () => {
    expectRecovered(matchLog(asLog(flyThreeAxes(1)), build));
  }, 120_000);

  it('from a foreign CSV in rad/s and µs with a columns file, and from the bench’s own heads', async () => {
    const flown = flyThreeAxes(2);
    const foreign = blobSource(new Blob([foreignCsv(flown, build)]), 'foreign.csv');
    const columns = parseColumns(FOREIGN_COLUMNS);
    expectRecovered(
      matchLog(await readLog(foreign, await openLog(foreign), columns, { range: build.esc }), build),
    );
    const own = blobSource(new Blob([ownCsv(flown, build)]), 'own.csv');
    const proposal = await openLog(own);
    expect(proposal.ownRecord).toBe(true);
    const log = await readLog(own, proposal, proposal.columns, { range: build.esc });
    expect(log.t_s.length).toBe(flown.t_s.length);
  }, 180_000);

  it('an axis that was not excited has no numbers and says why', () => {
    const flown = flyThreeAxes(3, (axis) =>
      axis === 'pitch'
        ? { setpoint_dps: () => 0, gust_dps2: 2 }
        : { setpoint_dps: multisine(60, [0.5, 1.1, 2.3, 4.7]) },
    );
    const { axes } = matchLog(asLog(flown), build);
    expect(axes.pitch.estimates).toBeNull();
    expect(axes.pitch.note.length).toBeGreaterThan(20);
    expect(axes.roll.estimates).not.toBeNull();
  }, 120_000);

  it('junk is refused by name', async () => {
    const poem = blobSource(new Blob(['roses are red\nviolets are blue\n']), 'poem.csv');
    await expect(
      openLog(poem).then((proposal) => readLog(poem, proposal, proposal.columns, { range: build.esc })),
    ).rejects.toThrow(/poem\.csv/);
  });
});

describe('excitation for the firmware', () => {
  it('a table of a suggested doublet starts and ends at rest and keeps its limit', () => {
    const [one] = suggestedExcitations('roll', 220);
    const parsed = parseExcitation(JSON.parse(JSON.stringify(one)));
    const values = excitationTable(parsed, 400)
      .split('\n')
      .filter((line) => /^[-\d]/.test(line))
      .map((line) => Number(line.split(/[,\t ]+/).at(-1)));
    expect(values.length).toBeGreaterThan(100);
    expect(Math.max(...values.map(Math.abs))).toBeLessThanOrEqual(220);
    expect(values[0]).toBe(0);
  });
});
