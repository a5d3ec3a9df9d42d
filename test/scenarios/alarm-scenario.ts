import type { Limit, Machine, OperatingCondition, Point, RunningRule } from '../../src/config/site.ts';
import { pointPath } from '../../src/config/site.ts';
import { type AlarmChange, type AlarmSubject, normalState, subjectKey } from '../../src/detection/alarm.ts';
import { type AlarmCommandName, rank } from '../../src/detection/alarm-event.ts';
import { alarmStep, standing } from '../../src/detection/alarm-state.ts';
import { conditionOf } from '../../src/detection/condition.ts';
import { detect, limitSubject, subjectsOf } from '../../src/detection/detect.ts';
import {
  type MachineMemory,
  type MachineState,
  machineStep,
  readingOf,
} from '../../src/detection/machine-state.ts';
import { overdue } from '../../src/detection/overdue.ts';
import { type LimitSituation, nothingKnown } from '../../src/detection/thresholds.ts';
import { changeOf, troubleRule, troubleToldInSummary } from '../../src/detection/trouble.ts';
import type { Measurement } from '../../src/manipulation/measurement.ts';
import { limitInForce } from '../../src/service/limits-in-force.ts';
import { AlarmBook, hourMs, machineWith, minuteMs, pointWith } from '../detection/site-parts.ts';
import { limitOf, measurementOf, ruleOf } from './alarm-words.ts';
import { conditionsOf, LearnedLevels } from './learned-levels.ts';

/**
 * A machine with two points, de-h and nde-h, of which de-h has one limit, in an operator's words. Each line is one
 * thing that happens; its answer is what the journal gets and whom it tells. A recording comes an hour after the
 * one before.
 *
 *   limit alert 2.8, danger 4.5, on-delay 2 recordings     begins anew with this limit (also: off-delay 3 h, deadband
 *                                                          10 %, say again at 25 %, latching, lower)
 *   limit zone for 110 kW rigid with baseline 1            a limit of kind zone, by ISO 20816-3; without a baseline too
 *   limit statistical, 4.5 spreads, danger 7.1           from what is usual; also: twice what is usual, change 0.7
 *   limit alert 2.8, with confidence, in full            only where the whole interval is past it; only in a condition
 *   conditions full 2900 to 3000 rpm, part ...           begins anew with these operating conditions
 *   40 days at 2 in full; repair                         what is usual is learned; begins anew after a repair
 *   runs by speed above 300 rpm | sidecar | level above 1  begins anew with this rule
 *   level 3.1, flag clipped, other 1.2                     a recording; nde-h in it too (also: at least, 80 % over 4.6,
 *                                                          averages 3, speed 0 rpm, said stopped, interval 2.5 to
 *                                                          3.1, other flag flat)
 *   other 1.2                                              a recording of nde-h alone
 *   late 3.1                                               one that starts before the newest
 *   too short                                              one without levels
 *   wait 3 h; look for silence; acknowledge; ...           commands take a kind of trouble: acknowledge dead-sensor
 */
export class AlarmScenario {
  #machine: Machine = machineWith();
  #nowMs = 0;
  #memory: MachineMemory | null = null;
  #book = new AlarmBook();
  readonly #learned = new LearnedLevels();
  readonly #arrivedMs = new Map<string, number>();

  /** Answers a line, with the hour before it. */
  play(line: string): string {
    const answers = this.#act(line);
    const minutes = Math.round(this.#nowMs / minuteMs);
    const time = `${String(Math.floor(minutes / 60)).padStart(2, '0')}:${String(minutes % 60).padStart(2, '0')}`;
    return `${time}  ${line.padEnd(36)} | ${answers.join(`\n${' '.repeat(43)} | `)}`;
  }

  #act(line: string): string[] {
    const [first = '', ...parts] = line.split(/,\s*/);
    const word = /^(late|level|other|too short)/.exec(first)?.[1];
    if (word !== undefined) return this.#recording(first, parts);
    if (first.startsWith('limit ')) return this.#begin({ limit: limitOf([first.slice(6), ...parts]) });
    if (first.startsWith('conditions ')) {
      this.#learned.beginAnew();
      return this.#begin({ conditions: conditionsOf([first.slice(11), ...parts]) });
    }
    const lived = this.#learned.live(first, this.#nowMs);
    if (lived !== null) {
      this.#nowMs += lived.ms;
      return [lived.answer];
    }
    if (first === 'repair') {
      this.#learned.beginAnew();
      return ['-'];
    }
    if (first.startsWith('runs by ')) return this.#begin({ running: ruleOf(first.slice(8)) });
    const wait = /^wait ([\d.]+) (h|min)$/.exec(first);
    if (wait !== null) {
      this.#nowMs += Number(wait[1]) * (wait[2] === 'h' ? hourMs : minuteMs);
      return ['-'];
    }
    if (first === 'look for silence') return this.#told(this.#lookForSilence());
    if (first === 'where does it stand') return this.#standings();
    if (first === 'the summary is sent') return this.#told(this.#summary());
    return this.#command(first);
  }

  #begin({ limit, running, conditions }: Begun): string[] {
    const [de, nde] = this.#machine.points;
    if (de === undefined || nde === undefined) throw new Error('a scenario has two points');
    const points = [pointWith({ limits: limit ? [limit] : de.limits }), { ...nde, limits: [] }];
    this.#machine = machineWith({
      points,
      running: running ?? this.#machine.running,
      conditions: conditions ?? this.#machine.conditions ?? [],
    });
    this.#book = new AlarmBook();
    this.#memory = null;
    return ['-'];
  }

  #recording(first: string, parts: readonly string[]): string[] {
    const late = first.startsWith('late');
    if (!late) this.#nowMs += hourMs;
    const usedMs = late ? this.#nowMs - 5 * hourMs : this.#nowMs;
    const all = [first.replace(/^late /, 'level '), ...parts];
    const own = all.filter((part) => !part.startsWith('other'));
    const other = all.flatMap((part) =>
      part.startsWith('other') ? [part.replace(/^other (?=\d)/, 'level ').replace(/^other /, '')] : [],
    );
    const shared = all.filter((part) => /^(speed|said)/.test(part));
    const measurements = new Map<string, Measurement>();
    if (own.some((part) => /^(level|too short)/.test(part))) measurements.set('de-h', measurementOf(own));
    if (other.length > 0) measurements.set('nde-h', measurementOf([...other, ...shared]));

    const readings = [...measurements].map(([id, m]): [string, boolean | null] => [
      id,
      readingOf(this.#machine.running, m),
    ]);
    const step = machineStep(this.#machine, this.#memory, new Map(readings), usedMs);
    if (!late) this.#memory = step.memory;
    const changes = this.#machine.points.flatMap((point) => {
      const measurement = measurements.get(point.id);
      const machine = step.points[point.id];
      if (measurement === undefined || machine === undefined) return [];
      this.#arrivedMs.set(pointPath(point), this.#nowMs);
      return this.#book.take(
        detect({
          point,
          measurement: { ...measurement, pointId: point.id },
          machineState: machine.state,
          readsStopped: machine.readsStopped,
          usedMs,
          late,
          recordingFlags: late ? ['late'] : [],
          condition: this.#conditionOf(measurement, machine.state),
          situations: this.#situations(point, measurement, machine.state),
          earlier: this.#book.states,
        }),
      );
    });
    const told = this.#toldOr(changes, this.#unjudged(measurements.get('de-h'), step.points['de-h']?.state));
    if (this.#machine.running === null) return told;
    return [step.memory.state, ...told.filter((text) => text !== '-')];
  }

  #conditionOf(measurement: Measurement, state: MachineState): string | null {
    return state === 'running' ? conditionOf(this.#machine.conditions ?? [], measurement) : null;
  }

  #situations(point: Point, measurement: Measurement, state: MachineState): Map<string, LimitSituation> {
    const speedHz = measurement.speed === null ? null : measurement.speed.rpm / 60;
    const situation = this.#learned.situation(this.#conditionOf(measurement, state), speedHz);
    return new Map(point.bands.map(({ id }) => [id, situation]));
  }

  /** Why the limit judges nothing of a recording; nothing where it does. */
  #unjudged(measurement: Measurement | undefined, state: MachineState | undefined): string[] {
    const [point] = this.#machine.points;
    const [limit] = point?.limits ?? [];
    const [band] = point?.bands ?? [];
    if (measurement === undefined || state !== 'running' || point === undefined) return [];
    if (limit === undefined || band === undefined) return [];
    const condition = this.#conditionOf(measurement, state);
    const situation = this.#situations(point, measurement, state).get(band.id) ?? nothingKnown;
    const level = measurement.levels[0]?.level ?? null;
    const { now } = limitInForce(limit, { condition, level, situation }, band.display);
    return 'unknown' in now && level !== null ? [`not judged: ${now.unknown}`] : [];
  }

  #lookForSilence(): AlarmChange[] {
    return [
      ...this.#book.take(
        overdue({
          points: this.#machine.points,
          lastArrivedMs: this.#arrivedMs,
          nowMs: this.#nowMs,
          startedMs: 0,
          waitingFor: new Set(),
          dropFolderReadable: true,
          earlier: this.#book.states,
        }),
      ),
    ];
  }

  #subjects(): AlarmSubject[] {
    return this.#machine.points.flatMap((point) => [
      ...subjectsOf(point),
      {
        kind: 'trouble',
        trouble: 'overdue',
        machineId: point.machineId,
        pointId: point.id,
        source: null,
      } as const,
    ]);
  }

  #summary(): AlarmChange[] {
    return this.#subjects().flatMap((subject) => {
      const state = this.#book.states.get(subjectKey(subject)) ?? normalState;
      const change = subject.kind === 'trouble' ? troubleToldInSummary(subject, state) : null;
      return change === null ? [] : this.#book.take([change]);
    });
  }

  #command(line: string): string[] {
    const [text = '', trouble] = line.split(/ (?=dead-sensor|reads-stopped|overdue|wrong-rate)/);
    const kind = commands[text];
    if (kind === undefined) throw new Error(`no such line in a scenario: ${line}`);
    const [de] = this.#machine.points;
    const limit = de?.limits[0];
    const subject = this.#subjects().find((one) =>
      one.kind === 'limit'
        ? trouble === undefined
        : one.trouble === trouble && rank(this.#book.states.get(subjectKey(one))?.highest ?? null) > 0,
    );
    if (de === undefined || limit === undefined) throw new Error('a scenario has a limit');
    const about = subject ?? limitSubject(de, limit);
    const before = this.#book.states.get(subjectKey(about)) ?? normalState;
    const rule = about.kind === 'limit' ? limit : troubleRule(about.trouble);
    const step = alarmStep(before, { kind, comment: null, reason: {} }, rule);
    const change = changeOf(about, before, step);
    if (change === null) return [`no: ${step.ignored}`];
    return this.#told(this.#book.take([change]));
  }

  #toldOr(changes: readonly AlarmChange[], otherwise: readonly string[]): string[] {
    const told = this.#told(changes);
    return told[0] === '-' && otherwise.length > 0 ? [...otherwise] : told;
  }

  #told(changes: readonly AlarmChange[]): string[] {
    const lines = changes.flatMap(({ subject, state, journal, tell }) =>
      journal.map(({ event, before, after }) => {
        const moves = before === after ? '' : `, ${before} -> ${after}`;
        const calls =
          tell?.event === event
            ? `, TELL ${tell.severity}${tell.level === null ? '' : ` ${tell.level}`}`
            : '';
        return `${nameOf(subject)}: ${event}${moves}${calls} [${standing(state)}]`;
      }),
    );
    return lines.length > 0 ? lines : ['-'];
  }

  #standings(): string[] {
    const lines = this.#subjects().flatMap((subject) => {
      const state = this.#book.states.get(subjectKey(subject)) ?? normalState;
      if (standing(state) === 'normal') return [];
      return [`${nameOf(subject)}: ${standing(state)}, ${state.condition}, ${state.count} counted`];
    });
    return lines.length > 0 ? lines : ['all normal'];
  }
}

interface Begun {
  readonly limit?: Limit;
  readonly running?: RunningRule;
  readonly conditions?: readonly OperatingCondition[];
}

const commands: Readonly<Record<string, AlarmCommandName>> = {
  acknowledge: 'acknowledge',
  reset: 'reset',
  shelve: 'shelve',
  unshelve: 'unshelve',
  'the shelf expires': 'shelf-expired',
  'out of service': 'out-of-service',
  'in service': 'in-service',
  suppress: 'suppress',
  unsuppress: 'unsuppress',
  'the limit is removed': 'limit-removed',
};

function nameOf(subject: AlarmSubject): string {
  return subject.kind === 'limit'
    ? `${subject.pointId} ${subject.bandId}`
    : `${subject.pointId} ${subject.trouble}`;
}
