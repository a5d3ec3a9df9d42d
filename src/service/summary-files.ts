import { existsSync, mkdirSync, renameSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';

/** The summary as files in the data folder: `latest.html` for people, one a date to look back. */

export function summaryFolder(dataFolder: string): string {
  return join(dataFolder, 'summary');
}

export function hasSummaryFile(dataFolder: string, localDate: string): boolean {
  return existsSync(join(summaryFolder(dataFolder), `${localDate}.html`));
}

/** Each is there whole or not at all. Throws what the file system says. */
export function writeSummaryFiles(dataFolder: string, localDate: string, html: string): void {
  const folder = summaryFolder(dataFolder);
  mkdirSync(folder, { recursive: true });
  writeWhole(join(folder, 'latest.html'), html);
  writeWhole(join(folder, `${localDate}.html`), html);
}

function writeWhole(file: string, text: string): void {
  writeFileSync(`${file}.part`, text);
  renameSync(`${file}.part`, file);
}
