/** UFF 58, NPY and HDF5 at the command line: drafted, checked, analysed, named by `files`. */
import { mkdirSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { loadSite } from '../../src/config/load.ts';
import { hdf5Bytes, npyBytes, universalBytes } from '../acquisition/container-writers.ts';
import { run } from './small-site.ts';

const rateHz = 5120;
const frames = 2 * rateHz;
/** 2 and 3 m/s2 r.m.s. at 200 Hz. */
const channels = [2, 3].map((level) =>
  Float64Array.from(
    { length: frames },
    (_, n) => level * Math.SQRT2 * Math.sin((2 * Math.PI * 200 * n) / rateHz),
  ),
);

let folder: string;

beforeAll(async () => {
  folder = mkdtempSync(join(tmpdir(), 'humledger-containers-'));
  mkdirSync(join(folder, 'drop'));
  const stamp = '20260302T060000Z';
  const put = (name: string, bytes: Uint8Array) => writeFileSync(join(folder, 'drop', name), bytes);
  put(`fan-1_${stamp}.uff`, universalBytes(channels, rateHz, 'bytes'));
  put(`pump-2_${stamp}.npy`, npyBytes(channels));
  put(`mill-3_${stamp}.h5`, await hdf5Bytes(channels, rateHz));
});
afterAll(() => rmSync(folder, { recursive: true }));

const ran = (...args: string[]) => run(args, { workingFolder: folder });

interface Analysed {
  readonly sample_rate_hz: number;
  readonly channels: readonly {
    readonly channel: string;
    readonly bands: readonly { readonly level: number }[];
  }[];
}

describe('analyse', () => {
  it.each([
    ['fan-1_20260302T060000Z.uff', ['1 +Z', '2 +Z'], []],
    ['pump-2_20260302T060000Z.npy', ['1', '2'], ['--sample-rate', '5120']],
    ['mill-3_20260302T060000Z.h5', ['ch1', 'ch2'], ['--dataset', '/fan', '--sample-rate-attribute', 'fs']],
  ])('%s gives the levels that are in it', async (name, names, options) => {
    const args = ['--samples-in', 'm/s2', '--band', '100..300', '--json', ...options];
    const { status, out, err } = await ran('analyse', `drop/${name}`, ...args);
    expect([status, err]).toEqual([0, '']);
    const { sample_rate_hz, channels } = JSON.parse(out) as Analysed;
    expect(sample_rate_hz).toBeCloseTo(rateHz, 1);
    expect(channels.map(({ channel }) => channel)).toEqual(names);
    for (const [index, level] of [2, 3].entries())
      expect(channels[index]?.bands[0]?.level).toBeCloseTo(level, 3);
  });

  it('says which data sets there are, and what to write', async () => {
    const { status, err } = await ran('analyse', 'drop/mill-3_20260302T060000Z.h5', '--samples-in', 'm/s2');
    expect(status).toBe(1);
    expect(err).toContain('2 data sets in it (/fan/ch1, /fan/ch2); say which: dataset: /fan/ch1');
  });

  it.each([
    [
      ['--channels-in', 'column'],
      "--channels-in: 'column' is neither columns nor rows; write: --channels-in 'columns'",
    ],
    [
      ['--dataset', 'fan'],
      "--dataset: 'fan' does not begin at the root of the file; write: --dataset '/fan'",
    ],
  ])('refuses %j', async (options, told) => {
    const { status, err } = await ran('analyse', 'drop/pump-2_20260302T060000Z.npy', ...options);
    expect(status).toBe(2);
    expect(err).toContain(told);
  });
});

describe('a site file', () => {
  it('is drafted from them, and says of what it left out which key is missing', async () => {
    const { status, out } = await ran('draft', 'drop');
    expect(status).toBe(0);
    expect(out).toContain('2 machines, 4 points from 2 files');
    expect(out).toMatch(/not taken in: mill-3.*say which: dataset: \/fan\/ch1/);
    const path = join(folder, 'site.yaml');
    const text = readFileSync(path, 'utf8');
    const loaded = loadSite(text, path);
    if (!loaded.ok) throw new Error(JSON.stringify(loaded.problems));
    const points = loaded.site.machines.flatMap((machine) => machine.points);
    expect(points.map(({ channel }) => channel)).toEqual(['1 +Z', '2 +Z', 1, 2]);
  });

  it('with the missing keys is checked against them, and files knows whose they are', async () => {
    const text = `site: Larkfen
time_zone: UTC
folders:
  drop: ./drop
  data: ./data
recordings:
  files: <machine>_<any>
  start_in_name: <year><month><day>T<hour><minute><second>Z
  expected_every: 1 h
  samples_in: m/s2
machines:
  - id: mill-3
    recordings:
      files: <machine>_<any>.h5
      dataset: /fan
      sample_rate_attribute: fs
    points:
      - id: de
        channel: ch2
        quantity: acceleration
        bands:
          - id: tone
            from: 100 Hz
            to: 300 Hz
            unit: m/s2
`;
    writeFileSync(join(folder, 'mill.yaml'), text);
    const checked = await ran('check', '--site', 'mill.yaml');
    expect(checked.out).toMatch(/de +tone +3 m\/s²/);
    const files = await ran('files', '--site', 'mill.yaml');
    expect(files.out).toMatch(/mill-3_20260302T060000Z\.h5 .*\s+taken by mill-3\/de/);
  });
});
