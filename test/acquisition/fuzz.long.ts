import { writeFileSync } from 'node:fs';
import { expect, it } from 'vitest';
import { parseSidecar } from '../../src/acquisition/sidecar.ts';
import { judgeName } from './judge-names.ts';
import { judge } from './judge-spoilt.ts';
import { spoiltContainer } from './spoilt-containers.ts';
import { hostileName, spoiltRecording, spoiltSidecar, wholeRecording } from './spoilt-recordings.ts';

/**
 * A million spoilt recordings; HUMLEDGER_FUZZ_FROM and HUMLEDGER_FUZZ_COUNT name another part of the same endless row, so that a
 * run can be broken off and gone on with. HUMLEDGER_FUZZ_REPORT names a file that says how far it is.
 */
const seed = 20261201;
const from = Number(process.env.HUMLEDGER_FUZZ_FROM ?? 0);
const count = Number(process.env.HUMLEDGER_FUZZ_COUNT ?? 1_000_000);
const reportFile = process.env.HUMLEDGER_FUZZ_REPORT;
/** Far more than any of these files of a few kilobytes may take, also on a machine that does other things. */
const slowMs = 5_000;
const reportEvery = 5_000;

interface Report {
  from: number;
  done: number;
  answers: Record<string, number>;
  failures: string[];
  slowestMs: number;
  slowest: number;
  peakMb: number;
}

async function fuzz(
  name: string,
  numbers: { from: number; count: number },
  answerTo: (n: number) => string | Promise<string>,
): Promise<Report> {
  const report: Report = {
    from: numbers.from,
    done: 0,
    answers: {},
    failures: [],
    slowestMs: 0,
    slowest: 0,
    peakMb: 0,
  };
  const say = () => {
    report.peakMb = Math.round(process.resourceUsage().maxRSS / 1024);
    if (reportFile !== undefined) writeFileSync(`${reportFile}.${name}`, `${JSON.stringify(report)}\n`);
  };
  for (let number = numbers.from; number < numbers.from + numbers.count; number++) {
    const begunMs = performance.now();
    try {
      const answer = await answerTo(number);
      report.answers[answer] = (report.answers[answer] ?? 0) + 1;
    } catch (error) {
      if (report.failures.length < 100) report.failures.push(`${number}: ${(error as Error).message}`);
    }
    const tookMs = performance.now() - begunMs;
    if (tookMs > report.slowestMs) Object.assign(report, { slowestMs: tookMs, slowest: number });
    if (++report.done % reportEvery === 0) say();
  }
  say();
  return report;
}

it(`${count} spoilt recordings from number ${from} on`, async () => {
  const report = await fuzz('recordings', { from, count }, (number) => judge(spoiltRecording(seed, number)));
  expect(report.failures).toEqual([]);
  expect(report.slowestMs, `number ${report.slowest}`).toBeLessThan(slowMs);
  expect(report.peakMb).toBeLessThan(600);
});

it.each(['UFF 58', 'NPY', 'HDF5'] as const)(`${Math.min(count, 20_000)} spoilt %s files`, async (kind) => {
  const numbers = { from, count: Math.min(count, 20_000) };
  const report = await fuzz(kind, numbers, (number) => judge(spoiltContainer(kind, seed, number)));
  expect(report.failures).toEqual([]);
  expect(report.slowestMs, `number ${report.slowest}`).toBeLessThan(slowMs);
  expect(report.peakMb).toBeLessThan(600);
});

it('100,000 spoilt sidecars and as many hostile names', async () => {
  const numbers = { from, count: Math.min(count, 100_000) };
  const sidecars = await fuzz('sidecars', numbers, (number) => {
    const sidecar = parseSidecar(spoiltSidecar(seed, number));
    return 'reason' in sidecar ? 'refused' : judge(wholeRecording(number), sidecar);
  });
  const names = await fuzz('names', numbers, (number) => judgeName(hostileName(seed, number)));
  expect([...sidecars.failures, ...names.failures]).toEqual([]);
});
