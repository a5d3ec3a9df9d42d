import { readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { MailScenario } from './mail-scenario.ts';

/**
 * Each mail-*.txt is a story of who gets which mail when: remarks begin with '#', lines that happen stand at the margin, the
 * mails they bring are indented below them. A blank line begins another story. UPDATE_EXPECTED=1 rewrites the mails. Read the
 * diff, and commit only what you can explain.
 */
const folder = import.meta.dirname;

async function played(text: string): Promise<string> {
  const stories: string[] = [];
  for (const story of text.trimEnd().split(/\n{2,}/)) {
    const scenario = new MailScenario();
    const lines: string[] = [];
    for (const line of story.split('\n')) {
      if (line.startsWith(' ')) continue;
      lines.push(line.startsWith('#') ? line : await scenario.play(line));
    }
    stories.push(lines.join('\n'));
  }
  return `${stories.join('\n\n')}\n`;
}

describe('stories of mails', () => {
  const files = readdirSync(folder).filter((name) => /^mail-.*\.txt$/.test(name));

  it('are on file', () => {
    expect(files.length).toBeGreaterThanOrEqual(4);
  });

  it.each(files)('%s goes as told', async (name) => {
    const file = join(folder, name);
    const now = await played(readFileSync(file, 'utf8'));
    if (process.env.UPDATE_EXPECTED === '1') writeFileSync(file, now);
    expect(now).toBe(readFileSync(file, 'utf8'));
  });
});
