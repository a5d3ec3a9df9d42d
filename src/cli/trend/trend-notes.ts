import { plain } from '../../advisory/escape.ts';
import { breakingKinds, type NoteKind, type StoredNote } from '../../store/notes.ts';
import { timeText } from '../when.ts';

/** What was done to a machine, between the levels of its trend. */

const kindName: Readonly<Record<NoteKind, string>> = {
  repair: 'repair',
  'sensor-changed': 'sensor changed',
  lubricated: 'lubricated',
  balanced: 'balanced',
  remark: 'remark',
};

/** A line across the table where nothing is compared across; else a remark between two rows. */
export function noteText({ kind, atMs, found, comment, by }: StoredNote, timeZone: string): string {
  const breaks = breakingKinds.includes(kind);
  const said = [
    `${kindName[kind]}, ${timeText(atMs, timeZone)}, ${plain(by)}`,
    ...(comment === null ? [] : [plain(comment)]),
    ...(found === null ? [] : [`found: ${plain(found)}`]),
    ...(breaks ? ['do not compare with levels above'] : []),
  ];
  return `${breaks ? '--- ' : ''}${said.join('; ')}`;
}

export function noteJson(note: StoredNote): Record<string, unknown> {
  return {
    time: new Date(note.atMs).toISOString(),
    note: note.kind,
    whole_machine: note.pointId === null,
    by: note.by,
    comment: note.comment,
    found: note.found,
  };
}
