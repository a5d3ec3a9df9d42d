import { describe, expect, it } from 'vitest';
import { complaints, exampleWith, siteOf } from './site-parts.ts';

const files = '  files: <machine>_<any>.wav';
const said = (...lines: string[]) =>
  exampleWith([files, [files, ...lines.map((line) => `  ${line}`)].join('\n')]);
const first = (text: string) => siteOf(text).machines[0]?.points[0]?.recordings.layout;

describe('where the samples stand in a file', () => {
  it('is left open where nothing is written', () => {
    expect(first(exampleWith())).toEqual({ dataset: null, sampleRateAttribute: null, channelsIn: null });
  });

  it('is said for all recordings, by path, attribute and side', () => {
    expect(
      first(said('dataset: /vibration/acceleration/', 'sample_rate_attribute: fs', 'channels_in: rows')),
    ).toEqual({ dataset: '/vibration/acceleration', sampleRateAttribute: 'fs', channelsIn: 'rows' });
    expect(first(said('dataset: /'))?.dataset).toBe('/');
  });

  it.each([
    ['dataset: vibration', "'vibration' does not begin at the root of the file"],
    ['channels_in: lines', "'lines' is none of columns, rows"],
  ])('refuses %s', (line, told) => {
    expect(complaints(said(line)).join('\n')).toContain(told);
  });

  it('is one for all points of the same files; the other is named', () => {
    const [machine] = siteOf(exampleWith()).machines;
    const [one, other] = machine?.points ?? [];
    const text = exampleWith([
      `      - id: ${other?.id}\n`,
      `      - id: ${other?.id}\n        recordings:\n          dataset: /b\n`,
    ]);
    expect(complaints(text).filter((line) => line.includes('samples stand'))).toEqual([
      expect.stringMatching(
        new RegExp(
          `${machine?.id}/${other?.id} and ${machine?.id}/${one?.id} take the same files, .*; give both the same dataset`,
        ),
      ),
    ]);
  });
});
