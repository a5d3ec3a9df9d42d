import { existsSync } from 'node:fs';
import { resolve } from 'node:path';
import { printableName } from '../../acquisition/file-name.ts';
import { judgeBand } from '../../config/bands.ts';
import type { Band, Site } from '../../config/site.ts';
import { type AnalysisPlan, analyseFile, type PlannedFile } from '../../service/analyse-file.ts';
import { readSiteFile } from '../../service/site-in-force.ts';
import { type AnalysedFile, analysisJson } from '../analyse/analysis-json.ts';
import { analysisText } from '../analyse/analysis-text.ts';
import { type OneOffOptions, oneOffOptionsGiven, readOneOffOptions } from '../analyse/options.ts';
import { plansOfChannels } from '../analyse/points-of-channels.ts';
import { plansOfSite } from '../analyse/points-of-site.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { fail, misused } from '../open.ts';
import { writeJson } from '../output.ts';

interface AnalyseOptions extends OneOffOptions {
  readonly site?: string;
  readonly spectrum?: boolean;
  readonly json?: boolean;
}

/** `analyse`: one-off analysis of files, without the ledger; by the site file's points or by options. */
export const addAnalyse: AddCommand = (program, io, done) => {
  program
    .command('analyse')
    .description('one-off analysis of recordings, without the ledger')
    .argument('<file...>', 'recordings')
    .option(
      '--site <file>',
      'site file whose points take the files by name (default: ./site.yaml if it is there)',
    )
    .option('--samples-in <unit>', 'what the samples are: V, m/s2, g, mm/s, in/s, um, ...')
    .option('--full-scale <value>', 'value of the largest integer sample, in that unit (default: 1)')
    .option('--sensitivity <value>', "of the sensor, such as '100 mV/g'; the samples are V then")
    .option('--sample-rate <hz>', 'of files that do not say it (CSV without time)')
    .option('--dataset <path>', 'HDF5: the data set, or the group whose data sets are the channels')
    .option('--sample-rate-attribute <name>', 'HDF5: the attribute that gives the sample rate in Hz')
    .option('--channels-in <side>', 'NPY, HDF5: columns or rows, where the shape does not tell')
    .option('--window <name>', 'hann (default), rectangular, hamming, blackman, blackman-harris, flat-top')
    .option('--overlap <percent>', '0 to 95 (default: 50)')
    .option('--segment <samples>', 'a power of two (default: as long as lines 1.6 Hz apart need)')
    .option('--band <from..to[:quantity]>', 'Hz; may be given several times', collect)
    .option('--spectrum', 'the density of every line too')
    .option('--json', 'one object a file; several files: an array')
    .addHelpText(
      'after',
      "\nExample:\n  humledger analyse --sensitivity '100 mV/g' --full-scale 10 --band 10..1000:velocity fan.wav",
    )
    .action(async (files: string[], options: AnalyseOptions) => {
      done(await analyse(files, options, io));
    });
};

function collect(value: string, before: readonly string[] = []): readonly string[] {
  return [...before, value];
}

/** How each file is to be planned for; or the exit status where the command line or site file is wrong. */
type Planner = { readonly largestBytes: number; readonly planFor: (path: string) => PlannedFile };

/** Largest file without a site file to say it. */
const usualLargestBytes = 4e9;

async function analyse(
  files: readonly string[],
  options: AnalyseOptions,
  io: CommandIo,
): Promise<ExitStatus> {
  const planner = plannerOf(options, io);
  if ('problems' in planner) return misused(io, planner.problems.join('\n'));
  const objects: unknown[] = [];
  let status: ExitStatus = 0;
  for (const file of files) {
    const analysed = await one(file, planner, io);
    if ('reason' in analysed) {
      status = fail(io, `${printableName(file)}: ${analysed.reason}`);
      continue;
    }
    for (const reason of analysed.analysis.missing) {
      status = fail(io, `${printableName(file)}: ${reason.replace(/^channel\//, 'channel ')}`);
    }
    for (const note of notes(analysed)) io.err.write(`${printableName(file)}: note: ${note}\n`);
    if (options.json === true) objects.push(analysisJson(analysed, options.spectrum === true));
    else
      io.out.write(
        `${objects.push(null) > 1 ? '\n' : ''}${analysisText(analysed, options.spectrum === true)}`,
      );
  }
  if (options.json === true && (objects.length > 0 || files.length > 1))
    writeJson(io.out, files.length === 1 ? objects[0] : objects);
  return status;
}

function plannerOf(
  options: AnalyseOptions,
  io: CommandIo,
): Planner | { readonly problems: readonly string[] } {
  const given = oneOffOptionsGiven(options);
  const usual = resolve(io.workingFolder, 'site.yaml');
  const path = options.site === undefined ? usual : resolve(io.workingFolder, options.site);
  if (given.length > 0 || (options.site === undefined && !existsSync(usual))) {
    if (options.site !== undefined) {
      return {
        problems: [`${given.join(', ')}: for analysis without a site file; leave out either these or --site`],
      };
    }
    const settings = readOneOffOptions(options);
    if ('wrong' in settings) return { problems: [settings.wrong] };
    return {
      largestBytes: usualLargestBytes,
      planFor: () => ({ layout: settings.layout, planFor: plansOfChannels(settings) }),
    };
  }
  const siteFile = readSiteFile(path);
  if ('problems' in siteFile) return siteFile;
  const { site }: { readonly site: Site } = siteFile;
  return { largestBytes: site.largestFileBytes, planFor: (file) => plansOfSite(site, file) };
}

async function one(
  file: string,
  planner: Planner,
  io: CommandIo,
): Promise<AnalysedFile | { readonly reason: string }> {
  const path = resolve(io.workingFolder, file);
  const { layout, planFor } = planner.planFor(path);
  let plan: AnalysisPlan | null = null;
  const analysis = await analyseFile(path, planner.largestBytes, {
    layout,
    planFor: (header, sidecar) => {
      const answer = planFor(header, sidecar);
      if (!('reason' in answer)) plan = answer;
      return answer;
    },
  });
  if ('reason' in analysis) return analysis;
  return { file, analysis, bands: analysis.measurements.map((measured) => bandsIn(plan, measured)) };
}

function bandsIn(
  plan: AnalysisPlan | null,
  { machineId, pointId }: { readonly machineId: string; readonly pointId: string },
): readonly Band[] {
  const found = plan?.points.find(({ point }) => point.machineId === machineId && point.id === pointId);
  return found?.point.bands ?? [];
}

/** What makes a level doubtful, and what was odd about the file. */
function notes({ analysis, bands }: AnalysedFile): string[] {
  const doubts = analysis.measurements.flatMap((measurement, n) => {
    const { averaging, channel } = measurement;
    if (averaging === null) return [];
    return (bands[n] ?? []).flatMap((band) =>
      judgeBand(band, {
        analysis: {
          window: averaging.window as 'hann',
          overlapPercent: averaging.overlapPercent,
          lineSpacingHz: averaging.lineSpacingHz,
          segmentSamples: averaging.segmentSamples,
          skipStartS: 0,
          confidencePercent: 95,
          falsePeaksPerSpectrum: 0.1,
        },
        sampleRateHz: measurement.sampleRateHz,
        runningSpeedHz: null,
        mounting: null,
        shown: `channel ${channel}`,
      }).map(({ what }) => what),
    );
  });
  return [...analysis.remarks, ...new Set(doubts)];
}
