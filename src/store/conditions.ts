import type { Reader, Writer } from './lent-connection.ts';

/** The condition of machines whose site file lists none. */
export const anyConditionId = 0;

/** Surrogate id of an operating condition by its id in the site file; made where there is none yet. */
export async function conditionId(writer: Writer, machineId: number, idInSite: string): Promise<number> {
  if (idInSite === '') return anyConditionId;
  const known = await findConditionId(writer, machineId, idInSite);
  if (known !== null) return known;
  const made = await writer
    .insertInto('conditions')
    .values({ machine_id: machineId, id_in_site: idInSite })
    .returning('id')
    .executeTakeFirstOrThrow();
  return made.id;
}

/** Null where no recording was ever made in it. */
export async function findConditionId(
  reader: Reader,
  machineId: number,
  idInSite: string,
): Promise<number | null> {
  if (idInSite === '') return anyConditionId;
  const row = await reader
    .selectFrom('conditions')
    .select('id')
    .where('machine_id', '=', machineId)
    .where('id_in_site', '=', idInSite)
    .executeTakeFirst();
  return row?.id ?? null;
}

/** Ids in the site file by surrogate id; 0 has none. */
export async function conditionNames(reader: Reader): Promise<Map<number, string>> {
  const rows = await reader.selectFrom('conditions').select(['id', 'id_in_site']).orderBy('id').execute();
  return new Map(rows.map((row) => [row.id, row.id_in_site]));
}
