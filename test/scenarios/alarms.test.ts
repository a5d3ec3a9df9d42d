import { readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { AlarmScenario } from './alarm-scenario.ts';

/**
 * Each alarm-*.txt is a story: remarks begin with '#', then lines that happen, a line of dashes, and what came of
 * them; a blank line ends a passage. UPDATE_EXPECTED=1 rewrites what came of them. Read the diff, and commit only what
 * you can explain.
 */
const folder = import.meta.dirname;

function played(text: string): string {
  const scenario = new AlarmScenario();
  return text
    .trimEnd()
    .split(/\n{2,}/)
    .map((passage) => {
      const before = (passage.split(/^----$/m)[0] as string).trimEnd().split('\n');
      const lines = before.filter((line) => line !== '' && !line.startsWith('#'));
      if (lines.length === 0) return before.join('\n');
      return [...before, '----', ...lines.map((line) => scenario.play(line))].join('\n');
    })
    .join('\n\n')
    .concat('\n');
}

describe('stories of alarms', () => {
  const files = readdirSync(folder).filter((name) => /^alarm-.*\.txt$/.test(name));

  it('are on file', () => {
    expect(files.length).toBeGreaterThanOrEqual(8);
  });

  it.each(files)('%s goes as told', (name) => {
    const file = join(folder, name);
    const text = readFileSync(file, 'utf8');
    const now = played(text);
    if (process.env.UPDATE_EXPECTED === '1') writeFileSync(file, now);
    expect(now).toBe(readFileSync(file, 'utf8'));
  });

  it('a line that nobody understands is refused, not skipped', () => {
    for (const line of ['levle 3', 'level 3, flag odd', 'limit alarm 3']) {
      expect(() => new AlarmScenario().play(line)).toThrow('no such');
    }
  });
});
