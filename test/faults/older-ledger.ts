import { cpSync, mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { gunzipSync } from 'node:zlib';
import { type Migration, migrations } from '../../src/store/migrations/index.ts';
import { type StoryRun, storyRunOn } from './story-run.ts';

/**
 * A ledger of version 1 as the program wrote it then, two hours into the story: an alarm waits for its second recording,
 * mails wait for their server. Kept as bytes, because today's program cannot write it any more.
 */
const kept = fileURLToPath(new URL('../files/ledgers/version-1/', import.meta.url));
export const hoursThen = 2;

/** One migration more than there are, so that there is always something to do, whose work can be seen in the ledger. */
const last: Migration = {
  number: migrations.length + 1,
  name: 'made up',
  statements: [
    'alter table levels add column level_db real',
    'update levels set level_db = 20 * log10(level / 1e-6) where level > 0',
    'create table levels_a_day (point_id integer not null, day integer not null, levels integer not null) strict',
    'insert into levels_a_day select point_id, used_ms / 86400000, count(*) from levels group by 1, 2',
  ],
};
export const newerMigrations: readonly Migration[] = [...migrations, last];

/** That ledger with its site and its drop folder, in a folder of its own with a mail server. */
export function olderStory(): Promise<StoryRun> {
  return storyRunOn(null, (folder, data) => {
    mkdirSync(join(folder, 'drop'));
    mkdirSync(data);
    writeFileSync(join(data, 'ledger.sqlite'), gunzipSync(readFileSync(join(kept, 'ledger.sqlite.gz'))));
    cpSync(join(kept, 'filings'), join(data, 'filings'), { recursive: true });
    cpSync(join(kept, 'site.yaml'), join(folder, 'site.yaml'));
    writeFileSync(join(folder, 'story-hour'), String(hoursThen));
  });
}
