import { createHash } from 'node:crypto';
import { join } from 'node:path';
import {
  longestNameBytes,
  nameOf,
  nameProblem,
  pathBytes,
  pathText,
  printableName,
  sidecarNameOf,
} from '../../src/acquisition/file-name.ts';
import { explainMismatch, siteFiles } from '../../src/acquisition/file-pattern.ts';
import {
  archivePlace,
  placesFor,
  quarantinePlace,
  setAsidePath,
  unassignedPlace,
} from '../../src/acquisition/filing-place.ts';
import { namePattern, startInName } from '../../src/acquisition/start-in-name.ts';
import { escapeHtml } from '../../src/advisory/escape.ts';
import { exampleText, siteOf } from '../config/site-parts.ts';

const site = siteOf(exampleText);
const files = siteFiles(site);
const starts = [
  '<year><month><day>T<hour><minute><second>Z',
  '<year>-<month>-<day>_<any><hour>h<minute>',
].map(namePattern);

function sure(holds: boolean, what: string): void {
  if (!holds) throw new Error(what);
}

/** What becomes of a file of that name, whatever the name: throws where a promise is broken. */
export function judgeName(bytes: Uint8Array): 'taken' | 'no point' | 'unusable' {
  const path = pathText(bytes);
  sure(pathBytes(path).equals(bytes), 'the name does not come back from its text');
  const shown = printableName(path);
  sure(
    !/[\p{Cc}\p{Zl}\p{Zp}\u202a-\u202e\u2066-\u2069]/u.test(shown) && shown.length <= 121,
    `shown as ${shown}`,
  );
  sure(!/[<>"]/.test(escapeHtml(shown)), 'the page would read it as its own');
  const sha256 = createHash('sha256').update(bytes).digest('hex');
  for (const place of [
    archivePlace(path, 1e12, sha256),
    quarantinePlace(path, sha256),
    unassignedPlace(path, sha256),
  ]) {
    const folder = place.slice(0, -nameOf(place).length);
    for (const one of [...placesFor(place, sha256), folder + sidecarNameOf(nameOf(place))]) {
      sure(join('/data', one) === `/data/${one}`, `${one} leads somewhere else`);
      const long = Buffer.byteLength(`${nameOf(one)}.reason.txt`);
      sure(long <= longestNameBytes && nameOf(one) !== '', `${one} has ${long} bytes`);
      sure(nameProblem(Buffer.from(nameOf(one))) === null && !nameOf(one).startsWith('.'), `filed as ${one}`);
    }
  }
  sure(setAsidePath({ from: path, sha256 }).startsWith('.humledger-'), 'set aside elsewhere');
  for (const pattern of starts) {
    const start = startInName(pattern, path);
    sure(start === null || Number.isFinite(start.ms), `it starts at ${start?.ms}`);
  }
  if (nameProblem(bytes) !== null) return 'unusable';
  if (files.pointsFor(path).length > 0) return 'taken';
  sure(!/[\n\r\0]/.test(explainMismatch(path, site).text), 'explained in more than a line');
  return 'no point';
}
