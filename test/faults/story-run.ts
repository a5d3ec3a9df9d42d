import { cpSync, mkdtempSync, readFileSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { onTestFinished } from 'vitest';
import type { StepName } from '../../src/service/steps.ts';
import { MailServerOnLoopback } from '../service/mail-server.ts';
import { makeSite, type SiteOnDisk, TrialService } from '../service/site-on-disk.ts';
import { playStory } from './story.ts';
import { type StoryState, stateOf } from './story-state.ts';

/**
 * All runs of the story begin from copies of one site with one ledger, because Message-IDs are made from the ledger's own
 * name. Nothing listens at the port that stands in it; each run puts its own there.
 */
const portOfNobody = 9;
let template: Promise<SiteOnDisk> | null = null;

async function makeTemplate(): Promise<SiteOnDisk> {
  const site = makeSite({
    mailPort: portOfNobody,
    recordings: 'overdue_after: 8 h',
    // Its two good recordings are pooled; the pool is open while most of the story is told.
    pump: 'analysis:\n  line_spacing: 10 Hz\n  average_over: 2 recordings',
  });
  const first = await TrialService.start(site);
  await first.stop();
  return site;
}

export function removeTemplate(): Promise<void> {
  return template === null ? Promise.resolve() : template.then((site) => site.remove());
}

/** A copy of the site with a mail server of its own. */
export interface StoryRun {
  readonly folder: string;
  readonly data: string;
  /** Ledger, files and mails as they are now; the service must be ended. */
  state(): StoryState;
  /** Message-IDs as the server took them, one after the other. */
  received(): string[];
}

/** `shelf`: a folder for the data on another file system; null: beside the drop folder. */
export async function storyRun(shelf: string | null): Promise<StoryRun> {
  template ??= makeTemplate();
  const { folder: from } = await template;
  return storyRunOn(shelf, (folder, data) => {
    cpSync(join(from, 'drop'), join(folder, 'drop'), { recursive: true });
    cpSync(join(from, 'data'), data, { recursive: true });
    cpSync(join(from, 'site.yaml'), join(folder, 'site.yaml'));
  });
}

/** `fill` puts the site file, the drop folder and the data into place. */
export async function storyRunOn(
  shelf: string | null,
  fill: (folder: string, data: string) => void,
): Promise<StoryRun> {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-story-'));
  const data = shelf === null ? join(folder, 'data') : mkdtempSync(join(shelf, 'humledger-story-'));
  onTestFinished(() => {
    for (const path of [folder, data]) rmSync(path, { recursive: true, force: true });
  });
  const server = await MailServerOnLoopback.start();
  fill(folder, data);
  const path = join(folder, 'site.yaml');
  const text = readFileSync(path, 'utf8')
    .replace(`port: ${portOfNobody}`, `port: ${server.port}`)
    .replace('./data', data);
  writeFileSync(path, text);
  const received = () => server.got.map(({ mail }) => mail.messageId ?? '');
  return { folder, data, received, state: () => stateOf(join(folder, 'drop'), data, received()) };
}

/** The same story with nothing in its way: what it leaves behind, and how often each step was reached. */
export interface Undisturbed {
  readonly state: StoryState;
  readonly steps: ReadonlyMap<StepName, number>;
}

const undisturbed = new Map<string, Promise<Undisturbed>>();

export function undisturbedRun(shelf: string | null): Promise<Undisturbed> {
  const known = undisturbed.get(shelf ?? '');
  if (known !== undefined) return known;
  const made = playUndisturbed(shelf);
  undisturbed.set(shelf ?? '', made);
  return made;
}

async function playUndisturbed(shelf: string | null): Promise<Undisturbed> {
  const run = await storyRun(shelf);
  const steps = new Map<StepName, number>();
  await playStory(run.folder, (name) => void steps.set(name, (steps.get(name) ?? 0) + 1));
  return { state: run.state(), steps };
}

/** A folder on another file system than the temporary one, or null. */
export const otherFileSystem: string | null = (() => {
  const found = statSync('/dev/shm', { throwIfNoEntry: false });
  return found?.isDirectory() && found.dev !== statSync(tmpdir()).dev ? '/dev/shm' : null;
})();
