import { existsSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { Writable } from 'node:stream';
import { describe, expect, it } from 'vitest';
import { filesOfStep, stepMs } from '../../src/cli/demo/scenario.ts';
import { beginMs, seed } from '../../src/cli/demo/time-lapse.ts';
import { main } from '../../src/cli/main.ts';

/**
 * The recordings that lie beside the demo's site file. UPDATE_EXPECTED=1 writes them anew.
 *   blower-1  before its bearing wears (day 10), and worn (day 42)
 *   mixer-3   running, with its sidecar
 */
const folder = 'demo-data/recordings';
const kept: readonly (readonly [name: string, step: number])[] = [
  ['blower-1_20260312T120000Z.wav', 84],
  ['blower-1_20260413T120000Z.wav', 340],
  ['mixer-3_20260413T120000Z.json', 340],
  ['mixer-3_20260413T120000Z.wav', 340],
];

function generated(name: string, step: number): Uint8Array {
  const file = filesOfStep(step, beginMs + step * stepMs, seed).find((one) => one.name === name);
  if (file === undefined) throw new Error(`step ${step} of the story has no ${name}`);
  return file.bytes;
}

if (process.env.UPDATE_EXPECTED === '1') {
  for (const [name, step] of kept) writeFileSync(join(folder, name), generated(name, step));
}

describe('the recordings beside the demo site', () => {
  it('are those that are named, together under 600 kB', () => {
    expect(readdirSync(folder).sort()).toEqual(kept.map(([name]) => name));
    const sizes = kept.map(([name]) => readFileSync(join(folder, name)).length);
    expect(sizes.reduce((sum, size) => sum + size, 0)).toBeLessThan(600_000);
  });

  // The sine of another engine may differ in its last bit, and so a sample that lies half way between two steps.
  it.each(kept)('%s is what the generator makes, to one step of the converter in a sample', (name, step) => {
    const [found, made] = [readFileSync(join(folder, name)), generated(name, step)];
    expect(found.length).toBe(made.length);
    if (name.endsWith('.json')) {
      expect(found.toString()).toBe(new TextDecoder().decode(made));
      return;
    }
    expect(found.subarray(0, 44)).toEqual(Buffer.from(made.subarray(0, 44)));
    const samples = (bytes: Uint8Array) =>
      new Int16Array(bytes.buffer.slice(bytes.byteOffset + 44, bytes.byteOffset + bytes.length));
    const [a, b] = [samples(found), samples(made)];
    let different = 0;
    let most = 0;
    for (let n = 0; n < a.length; n++) {
      const apart = Math.abs(a[n] - b[n]);
      if (apart > 0) different++;
      most = Math.max(most, apart);
    }
    expect(most).toBeLessThanOrEqual(1);
    expect(different).toBeLessThan(a.length / 1000);
  });

  it('tell a worn bearing from a sound one at the same overall velocity', async () => {
    const levels = await analysed(
      'blower-1_20260312T120000Z.wav',
      'blower-1_20260413T120000Z.wav',
      'mixer-3_20260413T120000Z.wav',
    );
    const [sound, worn, mixer] = levels;
    expect(sound['blower-1/de-h bearing']).toBeLessThan(1);
    expect(worn['blower-1/de-h bearing']).toBeGreaterThan(12);
    expect(worn['blower-1/de-h overall'] / sound['blower-1/de-h overall']).toBeLessThan(1.5);
    expect(worn['blower-1/nde-h bearing'] / sound['blower-1/nde-h bearing']).toBeCloseTo(1, 0);
    expect(mixer['mixer-3/in-h rpm']).toBeCloseTo(1455, -1);
  });
});

interface Channel {
  readonly machine: string;
  readonly point: string;
  readonly speed: { readonly rpm: number; readonly origin: string } | null;
  readonly bands: readonly { readonly band: string; readonly level: number }[];
}

/** `MACHINE/POINT BAND` to its level, one a file, by the program itself. */
async function analysed(...names: readonly string[]): Promise<Record<string, number>[]> {
  expect(existsSync('demo-data/site.yaml')).toBe(true);
  const [out, err] = [new Text(), new Text()];
  const files = names.map((name) => join(folder, name));
  const status = await main(['analyse', '--json', '--site', 'demo-data/site.yaml', ...files], {
    out,
    err,
    workingFolder: process.cwd(),
  });
  expect([status, err.text]).toEqual([0, '']);
  const answers = JSON.parse(out.text) as { readonly channels: readonly Channel[] }[];
  return answers.map(({ channels }) =>
    Object.fromEntries(
      channels.flatMap(({ machine, point, speed, bands }) => [
        [`${machine}/${point} rpm`, speed?.rpm ?? 0],
        ...bands.map(({ band, level }) => [`${machine}/${point} ${band}`, level] as const),
      ]),
    ),
  );
}

class Text extends Writable {
  text = '';
  override _write(chunk: Buffer, _encoding: string, done: () => void): void {
    this.text += chunk.toString();
    done();
  }
}
