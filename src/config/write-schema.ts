import { writeFileSync } from 'node:fs';
import { siteJsonSchema } from './schema.ts';

/** Run by hand after a change of the schema: `npx node src/config/write-schema.ts`, then format the file. */
const file = new URL('../../config/site.schema.json', import.meta.url);
writeFileSync(file, `${JSON.stringify(siteJsonSchema(), null, 2)}\n`);
