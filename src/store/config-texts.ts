import type { Reader } from './lent-connection.ts';

/** Text of the site file by which the newest recording was decided; null where there is none yet. */
export async function configInForce(reader: Reader): Promise<string | null> {
  const row = await reader
    .selectFrom('recordings')
    .innerJoin('config_versions', 'config_versions.id', 'recordings.config_version_id')
    .select('config_versions.text')
    .orderBy('recordings.id', 'desc')
    .limit(1)
    .executeTakeFirst();
  return row?.text ?? null;
}
