import type { EvidenceGrade } from '../manipulation/evidence.ts';
import { foreign } from './wording.ts';

/** What the lines of a recording say of a part of the machine; the sentence comes from the assessment. */
export interface EvidenceFacts {
  readonly grade: EvidenceGrade;
  readonly words: string;
}

/** Stands beside evidence wherever there is room for a sentence. */
export const evidenceCaution = 'It says where to look first; something else may make such lines.';

const mostEvidence = 3;
const strongestFirst: readonly EvidenceGrade[] = ['strong', 'clear', 'weak'];

/** Strongest first: 'clear evidence, never a verdict: three harmonics of BPFO ...'. */
export function evidenceLines(evidence: readonly EvidenceFacts[]): string[] {
  const rank = ({ grade }: EvidenceFacts) => strongestFirst.indexOf(grade);
  const ranked = [...evidence].sort((a, b) => rank(a) - rank(b));
  const said = ranked
    .slice(0, mostEvidence)
    .map(({ grade, words }) => `${grade} evidence, never a verdict: ${foreign(words)}`);
  const rest = ranked.length - mostEvidence;
  return rest > 0 ? [...said, `and ${rest} more`] : said;
}
