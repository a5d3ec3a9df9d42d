import { describe, expect, it } from 'vitest';
import { complaints, exampleText, exampleWith, listedCases, readList } from './site-parts.ts';

describe('mistakes in a site file', () => {
  const cases = listedCases(readList('traps.txt'));

  it.each(cases.map((one) => [one.remark, one.changes[0][1].trim().split('\n')[0], one] as const))(
    '%s (%s)',
    (_remark, _line, { changes, expected }) => {
      expect(complaints(exampleWith(...changes))).toEqual(expected);
    },
  );

  it('are told all at once, in the order of the file', () => {
    const broken = exampleWith(
      ['Europe/Dublin', 'Europe/Dubln'],
      ['drop: ./drop', 'drop: "C:\\new\\data"'],
      ['settle: 5 s', 'settle: 5'],
      ['alert: 2.8 mm/s', 'alert: 2,8 mm/s'],
      ['name: Aeration blower 1', 'name: Pump: north'],
      ['name: Aeration blower 2', 'name: Pump #2'],
      ["at: '06:30'", 'at: 0630'],
    );
    // Corrections lengthen lines on the way; the places are still those of the file as it stands.
    expect(complaints(broken).map((line) => line.split(':').slice(1, 3).join(':'))).toEqual([
      '9:12',
      '12:9',
      '25:11',
      '47:16',
      '57:11',
      '86:11',
      '133:7',
    ]);
  });

  it('are mended by the line that each message gives', () => {
    let mended = 0;
    for (const { changes, expected } of cases) {
      const broken = exampleWith(...changes);
      const match =
        expected.length === 1 ? /^site\.yaml:(\d+):\d+: .*; write: (.+)$/.exec(expected[0]) : null;
      if (match === null || / and danger: |, or |, beside /.test(match[2])) continue;
      const lines = broken.split('\n');
      const number = Number(match[1]) - 1;
      const indent = /^\s*/.exec(lines[number])?.[0] ?? '';
      lines[number] = `${indent}${match[2]}`;
      const left = complaints(lines.join('\n')).filter((line) => line.startsWith(`site.yaml:${number + 1}:`));
      expect([match[2], left]).toEqual([match[2], []]);
      mended++;
    }
    expect(mended).toBeGreaterThan(35);
  });

  it('are not seen where there are none: Windows line ends, a byte-order mark, long names in quotes', () => {
    expect(complaints(exampleText.replaceAll('\n', '\r\n'))).toEqual([]);
    expect(complaints(`\uFEFF${exampleText}`)).toEqual([]);
    expect(complaints(exampleWith(['name: Aeration blower 1', "name: 'Blower #2: north, left'"]))).toEqual(
      [],
    );
    expect(complaints(exampleWith(['drop: ./drop', 'drop: "C:\\\\logger\\\\new"']))).toEqual([]);
    expect(
      complaints(exampleWith(['site: Larkfen Waterworks', 'site: Larkfen Waterworks #but really a comment'])),
    ).toEqual([
      "site.yaml:8:7: '#' begins a comment, so site is only 'Larkfen Waterworks'; write: site: 'Larkfen Waterworks #but really a comment'",
    ]);
  });
});
