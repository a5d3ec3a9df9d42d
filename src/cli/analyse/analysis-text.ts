import { plain } from '../../advisory/escape.ts';
import { evidenceCaution } from '../../advisory/evidence-facts.ts';
import { bareLevel, unitText } from '../../advisory/level-words.ts';
import { printFrequency, printNumber, printSeconds } from '../../config/print-value.ts';
import type { Band } from '../../config/site.ts';
import { isFaultEvidence, speaksForFault } from '../../manipulation/evidence.ts';
import type {
  Averaging,
  BandLevel,
  Measurement,
  SpectralPeak,
  WaveformValues,
} from '../../manipulation/measurement.ts';
import { listing, table, wrapText } from '../output.ts';
import { type AnalysedFile, displayOf } from './analysis-json.ts';
import { envelopeText } from './envelope-output.ts';
import { noMachine } from './points-of-channels.ts';
import { ordersText, speedText } from './speed-output.ts';

/** Peaks that a table shows. */
const mostPeaks = 12;

/** What an analysis gave, for people: three or four significant figures. */
export function analysisText({ file, analysis, bands }: AnalysedFile, spectrum: boolean): string {
  const { start, sampleRateHz, frames, header } = analysis;
  const startText = new Date(start.startMs).toISOString().slice(0, 19).replace('T', ' ');
  const length =
    sampleRateHz === null
      ? `${frames} samples`
      : `${printSeconds(frames / sampleRateHz)} at ${printFrequency(sampleRateHz, 6)}`;
  const channels = header.channelNames.length;
  return [
    `${wrapText(plain(file), 80).join('\n')}\n`,
    listing(
      [
        [
          'start',
          `${startText} UTC, ${originWords[start.origin]}${start.remark === null ? '' : `; ${start.remark}`}`,
        ],
        ['length', `${length}, ${channels} ${channels === 1 ? 'channel' : 'channels'}, ${header.format}`],
        ['sha256', analysis.sha256],
      ],
      '  ',
    ),
    ...analysis.measurements.map((measurement, n) =>
      [
        channelText(measurement, bands[n] ?? [], analysis.quality),
        spectrum ? spectrumText(measurement, analysis.densities[n] ?? null) : '',
      ].join(''),
    ),
  ].join('');
}

const originWords = {
  sidecar: 'from its sidecar',
  'file-name': 'from its name',
  header: 'from its header',
  'time-column': 'from its time column',
  'modification-time': 'the time of its last change, for want of a better one',
} as const;

function channelText(
  measurement: Measurement,
  bands: readonly Band[],
  recordingQuality: Measurement['quality'],
): string {
  const { speed, waveform, averaging } = measurement;
  const inSite = measurement.machineId !== noMachine;
  const quality = [...recordingQuality, ...measurement.quality];
  const head = `\nChannel ${plain(measurement.channel)}${inSite ? `: ${measurement.machineId}/${measurement.pointId}` : ''}, ${measurement.quantity} in ${measurement.unit}\n`;
  const facts: [string, string][] = [];
  if (speed !== null) facts.push(['speed', speedText(speed)]);
  facts.push([
    'averaging',
    averaging === null ? 'none: not even one segment fits' : averagingText(averaging),
  ]);
  facts.push(['waveform', waveform === null ? 'none' : waveformText(waveform)]);
  if (measurement.orders != null) facts.push(['orders', ordersText(measurement.orders)]);
  if (measurement.envelope != null) facts.push(['envelope', envelopeText(measurement.envelope)]);
  if (quality.length === 0) facts.push(['quality', 'nothing to remark']);
  for (const [n, { flag, detail }] of quality.entries())
    facts.push([n === 0 ? 'quality' : '', `${flag}: ${detail}`]);
  facts.push(...evidenceFacts(measurement.evidence));
  return `${head}${listing(facts, '  ')}${bandTable(measurement, bands)}${peakTable('peak', measurement.peaks, measurement)}${orderPeaks(measurement)}${envelopePeaks(measurement)}`;
}

/** What the lines say of the parts, and that it is no verdict. */
function evidenceFacts(evidence: Measurement['evidence']): [string, string][] {
  if (evidence.length === 0) return [];
  const said = evidence.map((one): [string, string] => {
    const grade = isFaultEvidence(one) && one.isObservation ? 'observed' : one.grade;
    return ['', `${grade}: ${plain(one.words)}`];
  });
  const told: [string, string][] = evidence.some(speaksForFault)
    ? [['', `Evidence, never a verdict. ${evidenceCaution}`]]
    : [];
  return [...said, ...told].map(([, text], n) => [n === 0 ? 'evidence' : '', text]);
}

function averagingText(averaging: Averaging): string {
  const { window, overlapPercent, segmentSamples, lineSpacingHz, averages, effectiveAverages } = averaging;
  const seconds = printSeconds(1 / lineSpacingHz);
  return [
    `${window}, overlap ${printNumber(overlapPercent)} %, segment ${segmentSamples} samples (${seconds})`,
    `a line every ${printFrequency(lineSpacingHz)}`,
    `${averages} ${averages === 1 ? 'average' : 'averages'}, worth ${printNumber(effectiveAverages)} independent`,
    `${printNumber(averaging.usedPercent)} % of the recording used`,
    ...(averaging.detrend === 'linear' ? ['a straight line taken off each segment'] : []),
  ].join('; ');
}

function waveformText(waveform: WaveformValues): string {
  return [
    `mean ${printNumber(waveform.mean)}`,
    `r.m.s. ${printNumber(waveform.rms, 4)}`,
    `peak ${printNumber(waveform.peak, 4)}`,
    `crest factor ${printNumber(waveform.crestFactor)}`,
    `kurtosis ${printNumber(waveform.kurtosis)}`,
    `skewness ${printNumber(waveform.skewness)}`,
  ].join(', ');
}

function isOfEnvelope({ bandId }: BandLevel, bands: readonly Band[]): boolean {
  return bands.find(({ id }) => id === bandId)?.of === 'envelope';
}

function bandTable(measurement: Measurement, bands: readonly Band[]): string {
  if (measurement.levels.length === 0) return '';
  const [first] = measurement.levels;
  const rows = measurement.levels.map((level) => {
    const display = displayOf(level, bands);
    return [
      level.bandId,
      `${printFrequency(level.fromHz)} to ${printFrequency(level.toHz)}${isOfEnvelope(level, bands) ? ' of the envelope' : ''}`,
      `${level.atLeast ? 'at least ' : ''}${bareLevel(level.level, display)}`,
      `${bareLevel(level.intervalLow, display)} to ${bareLevel(level.intervalHigh, display)}`,
      unitText(display),
    ];
  });
  const interval = `interval (${printNumber(first?.confidencePercent ?? 95)} %)`;
  return `\n${indented(
    table(
      [
        { title: 'band', wraps: true },
        { title: 'from, to' },
        { title: 'level', right: true },
        { title: interval },
        { title: 'unit' },
      ],
      rows,
      78,
    ),
  )}`;
}

function envelopePeaks(measurement: Measurement): string {
  const { envelope } = measurement;
  return envelope == null ? '' : peakTable('envelope peak', envelope.peaks, measurement);
}

function orderPeaks(measurement: Measurement): string {
  const { orders } = measurement;
  return orders == null ? '' : peakTable('peak over orders', orders.peaks, measurement);
}

function peakTable(what: string, peaks: readonly SpectralPeak[], { unit, averaging }: Measurement): string {
  if (averaging === null) return '';
  if (peaks.length === 0) return `\n  no ${what} stands out of the noise floor\n`;
  const rows = peaks
    .slice(0, mostPeaks)
    .map((peak) => [
      printNumber(peak.frequencyHz, 6),
      peak.order === null ? '' : `${printNumber(peak.order, 4)}x`,
      printNumber(peak.level, 4),
      printNumber(peak.aboveFloorDb),
      [...peak.names, ...(peak.kind === 'hump' ? ['wider than a tone'] : [])].join('; '),
    ]);
  const more = peaks.length > mostPeaks ? `  and ${peaks.length - mostPeaks} weaker peaks\n` : '';
  return `\n${indented(
    table(
      [
        { title: `${what}, Hz`, right: true },
        { title: 'order', right: true },
        { title: `level, ${unit} r.m.s.`, right: true },
        { title: 'dB over the floor', right: true },
        { title: '', wraps: true },
      ],
      rows,
      78,
    ),
  )}${more}`;
}

function spectrumText({ averaging, unit, spectrum }: Measurement, density: Float64Array | null): string {
  if (density === null || averaging === null) return '\n  no spectrum\n';
  const rows = Array.from(density, (value, line) => [
    printNumber(line * averaging.lineSpacingHz, 7),
    printNumber(value, 4),
  ]);
  const held = spectrum?.averaging === 'peak-hold' ? 'highest density of all segments' : 'density';
  const columns = [
    { title: 'Hz', right: true },
    { title: `${held}, (${unit})²/Hz`, right: true },
  ];
  return `\n${indented(table(columns, rows, 78))}`;
}

function indented(text: string): string {
  return text.replace(/^(?=.)/gm, '  ');
}
