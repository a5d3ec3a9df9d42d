import { readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { HeldScenario } from './held-scenario.ts';

/** Each held-*.txt is a story, as those of alarms.test.ts; UPDATE_EXPECTED=1 rewrites what came of its lines. */
const folder = import.meta.dirname;

async function played(text: string): Promise<string> {
  const scenario = await HeldScenario.begin();
  const passages: string[] = [];
  for (const passage of text.trimEnd().split(/\n{2,}/)) {
    const before = (passage.split(/^----$/m)[0] as string).trimEnd().split('\n');
    const lines = before.filter((line) => line !== '' && !line.startsWith('#'));
    const answers: string[] = [];
    for (const line of lines) answers.push(await scenario.play(line));
    passages.push(lines.length === 0 ? before.join('\n') : [...before, '----', ...answers].join('\n'));
  }
  await scenario.end();
  return `${passages.join('\n\n')}\n`;
}

describe('stories of alarms that are held back', () => {
  const files = readdirSync(folder).filter((name) => /^held-.*\.txt$/.test(name));

  it('are on file', () => expect(files.length).toBeGreaterThanOrEqual(4));

  it.each(files)('%s goes as told', async (name) => {
    const file = join(folder, name);
    const now = await played(readFileSync(file, 'utf8'));
    if (process.env.UPDATE_EXPECTED === '1') writeFileSync(file, now);
    expect(now).toBe(readFileSync(file, 'utf8'));
  });

  it('a line that nobody understands is refused, not skipped', async () => {
    const scenario = await HeldScenario.begin();
    for (const line of ['pump three', 'shelve fan for 3 h', 'wait a day'])
      await expect(scenario.play(line)).rejects.toThrow('no such');
    await scenario.end();
  });
});
