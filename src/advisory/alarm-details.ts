import { printFrequency, printNumber, printSeconds } from '../config/print-value.ts';
import { evidenceCaution, evidenceLines } from './evidence-facts.ts';
import type { AlarmFacts, LineFacts, LinesFacts, OtherPointFacts, RecordingFacts } from './facts.ts';
import { chatteringSaid } from './history-words.ts';
import type { Said } from './letter.ts';
import {
  bareLevel,
  counted,
  distanceText,
  intervalText,
  levelText,
  measuredText,
  percentText,
  unitText,
} from './level-words.ts';
import { reasonsText } from './limit-words.ts';
import { lineCourse } from './line-changes.ts';
import { comparedWith } from './ranking.ts';
import { durationText, momentText } from './time-words.ts';
import { trendSentence } from './trend-words.ts';
import { foreign, idText, nameOf, speedOrigin, standingText } from './wording.ts';
import { zoneSaid } from './zone-words.ts';

/** What an alarm mail says below the first lines, in the order in which one asks: a name and what is said of it. */
export type Detail = readonly [name: string, said: Said];

const mostLines = 4;
const mostNames = 2;
const mostPoints = 6;

export function alarmDetails(alarm: AlarmFacts, timeZone: string, writtenMs: number): Detail[] {
  const level = `${measuredText(alarm.level, alarm.band.display)}, ${intervalText(alarm.level, alarm.band.display)}`;
  return [
    ['Level', `${level}; ${bandText(alarm)}`],
    ['Limit', limitDetail(alarm)],
    ...reasonsDetail(alarm),
    ...(alarm.zone === null ? [] : [['Standard', zoneSaid(alarm.zone, alarm.band.display)] as const]),
    [
      'Since',
      `${momentText(alarm.sinceMs, timeZone)} (${durationText(writtenMs - alarm.sinceMs)}), ${counted(alarm.recordings, 'recording')} beyond the limit`,
    ],
    ...(alarm.chattering == null ? [] : [['Comes and goes', chatteringSaid(alarm.chattering)] as const]),
    ['Before', beforeDetail(alarm, timeZone)],
    ...trendDetail(alarm, timeZone),
    ...(alarm.lines === null ? [] : linesDetails(withSureOrders(alarm.lines, alarm.recording), timeZone)),
    ...evidenceDetail(alarm),
    ...otherPointsDetail(alarm.otherPoints),
    ['Recording', recordingDetail(alarm.recording, timeZone)],
    ...flagsDetail(alarm.recording),
    ['State', standingText(alarm, timeZone)],
  ];
}

function trendDetail({ trend, band }: AlarmFacts, timeZone: string): Detail[] {
  if (trend === null) return [];
  const said = trendSentence(trend, band.display, timeZone);
  return [['Trend', `${said.charAt(0).toUpperCase()}${said.slice(1)}`]];
}

function bandText({ band }: AlarmFacts): string {
  return `band ${idText(band.id)}, ${printFrequency(band.fromHz)} to ${printFrequency(band.toHz)}`;
}

function limitDetail(alarm: AlarmFacts): string {
  const { limit, band, level } = alarm;
  const other = alarm.severity === 'danger' ? 'alert' : 'danger';
  const said = ([alarm.severity, other] as const).map((severity) => {
    const at = limit[severity];
    if (at === null)
      return limit.unknown === undefined ? `no ${severity} limit` : `${severity} not reckoned now`;
    return `${severity} ${levelText(at, band.display)}: ${distanceText(comparedWith(limit, level.level), at)}`;
  });
  const line =
    limit.compared === undefined ? '' : `its line now ${levelText(limit.compared, band.display)}; `;
  const side = limit.side === 'lower' ? 'lower limit, ' : '';
  return `${side}${line}${said.join('; ')}`;
}

/** Why the limit stands where it stands, where it is not the site's own number. */
function reasonsDetail({ limit }: AlarmFacts): Detail[] {
  const said = reasonsText(limit);
  return said === null ? [] : [['Limit from', said]];
}

function beforeDetail({ before, band }: AlarmFacts, timeZone: string): string {
  const broken = before.broken ?? null;
  const since =
    broken === null
      ? null
      : `${broken.kind === 'repair' ? 'the repair' : 'the change of sensor'} of ${momentText(broken.atMs, timeZone)}`;
  const said: string[] = [];
  if (before.last.length > 0) {
    const levels = before.last.map(({ level }) => bareLevel(level, band.display)).join(', ');
    said.push(`${levels} ${unitText(band.display)} (the last ${before.last.length}, newest first)`);
  }
  if (before.dayBefore !== null) said.push(`a day ago ${bareLevel(before.dayBefore.level, band.display)}`);
  if (before.weekBefore !== null) said.push(`a week ago ${bareLevel(before.weekBefore.level, band.display)}`);
  if (before.baseline !== null) said.push(`baseline ${bareLevel(before.baseline, band.display)}`);
  if (said.length === 0)
    return since === null ? 'no earlier level under these settings' : `no earlier level since ${since}`;
  if (since !== null) said.push(`nothing from before ${since}`);
  return said.join('; ');
}

/** An order is named where the speed is known well enough to tell it from its neighbours: within a quarter order. */
const sureOrder = 0.25;

function withSureOrders(facts: LinesFacts, { speed }: RecordingFacts): LinesFacts {
  if (speed === null) return facts;
  const largest = (sureOrder * speed.rpm) / speed.uncertaintyRpm;
  const lines = facts.lines.map((line) =>
    line.order !== null && line.order > largest ? { ...line, order: null } : line,
  );
  return { ...facts, lines };
}

function linesDetails(facts: LinesFacts, timeZone: string): Detail[] {
  if (facts.lines.length === 0) return [['Lines', 'none stands out of the noise floor']];
  const unit = unitText(facts.display);
  const list = (lines: readonly LineFacts[]): string => {
    const rest = lines.length - mostLines;
    const said = lines.slice(0, mostLines).map((line) => lineText(line, facts));
    return `${said.join('; ')}${rest > 0 ? `; and ${rest} more` : ''}`;
  };
  if (facts.comparedWithMs === null)
    return [['Lines', `in ${unit}: ${list(facts.lines)}; no earlier spectrum to compare with`]];
  const of = (...courses: string[]) => facts.lines.filter((line) => courses.includes(lineCourse(line)));
  const rose = of('rose', 'new');
  const steady = of('same', 'fell', 'gone');
  const compared = `since ${momentText(facts.comparedWithMs, timeZone)}, in ${unit}`;
  return [
    ['Lines up', `${compared}: ${rose.length === 0 ? 'none rose by 3 dB or more' : list(rose)}`],
    ['Lines not up', steady.length === 0 ? 'every line rose' : list(steady)],
  ];
}

function lineText(line: LineFacts, { display, comparedWithMs }: LinesFacts): string {
  const order = line.order === null ? '' : ` (${printNumber(line.order)}x)`;
  const now = line.level === null ? 'gone' : bareLevel(line.level, display);
  // The order says already which harmonic of the shaft it is.
  const names = line.names.filter((one) => !/^\d+x$/.test(one)).slice(0, mostNames);
  const named = names.length === 0 ? '' : ` [${foreign(names.join(', '))}]`;
  const name = `${printFrequency(line.frequencyHz)}${order}${named} ${now}`;
  if (comparedWithMs === null) return name;
  return `${name} (${line.levelBefore === null ? 'new' : `was ${bareLevel(line.levelBefore, display)}`})`;
}

function evidenceDetail({ evidence }: AlarmFacts): Detail[] {
  if (evidence.length === 0) return [];
  return [['Evidence', `${evidenceLines(evidence).join('; ')}. ${evidenceCaution}`]];
}

function otherPointsDetail(points: readonly OtherPointFacts[]): Detail[] {
  if (points.length === 0) return [];
  const ranked = [...points].sort((a, b) => (b.share ?? -1) - (a.share ?? -1));
  const said = ranked.slice(0, mostPoints).map(({ point, band, level, share }) => {
    if (band === null || level === null) return `${nameOf(point)}: no level`;
    const used = share === null ? 'no limit in force' : `${percentText(share)} of alert`;
    return `${nameOf(point)}: ${idText(band.id)} ${measuredText(level, band.display)}, ${used}`;
  });
  const rest = points.length - mostPoints;
  return [['Other points', `${said.join('; ')}${rest > 0 ? `; and ${rest} more` : ''}`]];
}

function recordingDetail(recording: RecordingFacts, timeZone: string): string {
  const { speed, averaging } = recording;
  const said = [`${momentText(recording.startMs, timeZone)}, ${printSeconds(recording.durationS)} long`];
  if (recording.arrival !== 'in-time') {
    const how =
      recording.arrival === 'late' ? 'late, after newer ones' : 'together with others after a pause';
    said.push(`it came ${how}, ${momentText(recording.arrivedMs, timeZone)}`);
  }
  if (speed === null) said.push('speed not known');
  else {
    const uncertain = speed.uncertaintyRpm > 0 ? `, ± ${printNumber(speed.uncertaintyRpm)} rpm` : '';
    said.push(`speed ${printNumber(speed.rpm, 4)} rpm (${speedOrigin[speed.origin]}${uncertain})`);
  }
  if (recording.loadPercent !== null) said.push(`load ${printNumber(recording.loadPercent)} %`);
  if (averaging === null) said.push('too short for one segment');
  else {
    said.push(
      `${counted(averaging.averages, 'average')}, worth ${printNumber(averaging.effectiveAverages)} independent (${averaging.window}, ` +
        `overlap ${printNumber(averaging.overlapPercent)} %, lines ${printNumber(averaging.lineSpacingHz)} Hz apart)`,
    );
  }
  if (recording.quality.length === 0) said.push('no quality flags');
  if (recording.fileName !== null) said.push(`file ${foreign(recording.fileName)}`);
  return said.join('; ');
}

function flagsDetail({ quality }: RecordingFacts): Detail[] {
  if (quality.length === 0) return [];
  const said = quality.map(({ flag, detail }) => (detail === '' ? flag : `${flag}: ${foreign(detail)}`));
  return [['Flags', `${said.join('; ')}. A flagged recording can raise or hold an alarm, never clear one.`]];
}
