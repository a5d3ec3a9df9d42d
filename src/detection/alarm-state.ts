import type { AlarmStanding, AlarmState } from './alarm.ts';
import {
  type Act,
  acknowledge,
  acknowledgeAndEnd,
  lift,
  nothing,
  release,
  releaseAndEnd,
  removeLimit,
  sayAgainInTime,
  suppressAs,
} from './alarm-commands.ts';
import type { AlarmCommandName, AlarmEvent, AlarmRule, AlarmStep, Judged } from './alarm-event.ts';
import { judge } from './alarm-judged.ts';

/**
 * THEORY OF OPERATION
 *
 * One alarm for each limit, one for each kind of trouble at its scope. This machine takes an alarm's state and one
 * event and answers the next state, the journal entries and, where people are to be told, the telling. It reads no
 * clock and keeps nothing: same state and event, same answer. Every pair of state and event is defined; where an
 * event means nothing, the state stays and the answer says why.
 *
 * The states are those of ANSI/ISA-18.2-2016 (IEC 62682), by their letters. They are derived from the record by
 * `standing`, never stored.
 *
 *                  condition arises, after the on-delay
 *      +-------------+ -----------------------------> +------------------+ <--+ severity rises
 *      | A normal    |                                | B unacknowledged |    | (from B, C), or worsens
 *      +-------------+ <--+                           +------------------+ ---+ (from C: said again)
 *        ^    ^    ^      |                             |     |      |
 *        |    |    |      | returns      acknowledge    |     |      | returns, latching
 *        |    |    |   +-----------------+ <------------+     |      v
 *        |    |    |   | C acknowledged  |                    |   +------------------------+
 *        |    |    |   +-----------------+             returns|   | E latched, unack.      |
 *        |    |    |      | returns, latching                 |   +------------------------+
 *        |    |    |      v                                   |      | acknowledge   | reset
 *        |    |    |   +-----------------+ <----------------- | -----+               |
 *        |    |    +---| F latched, ack. |                    v                      v
 *        |    |  reset +-----------------+            +-------------------------------+
 *        |    +---------------------------------------| D returned, unacknowledged    |
 *        |            acknowledge                     +-------------------------------+
 *        |                            D, E, F -> B when the condition arises again
 *        +--- any, when its limit leaves the site file
 *
 *      G shelved, H suppressed by design, I out of service lie over these: a set, not a state of its own. The
 *      condition is tracked on underneath, nothing is told. When the last one goes, what then stands is told.
 *
 * A life of an alarm lasts from leaving A until it is in A again; the ledger gives it its number. It exists exactly
 * while `highest` is set. Choices that the standard leaves to a site's philosophy:
 *
 * - A rise in severity, a worsening by `sayAgainPercent` and the end of `sayAgainAfterMs` (a re-alarm by time, from C
 *   to B) clear the acknowledgement and are told. A fall is neither told nor to be acknowledged. A return to normal is
 *   not told by itself; the summary tells it.
 * - G, H, I -> D, not A, where people were told before and nobody acknowledged. What came and went under a
 *   suppression without being told ends by itself; the journal has it.
 * - Acknowledging under a suppression is allowed; what was held back is told nevertheless.
 *
 * INVARIANTS (tests quote them by number)
 *
 * I1   No life (`highest` null) exactly when `sinceMs` is null and `count` 0; then the condition is normal, nothing
 *      is acknowledged, latched, told or held back.
 * I2   Neither the condition nor `told` is above `highest`.
 * I3   Under a suppression nothing is told.
 * I4   What was told and not acknowledged stays unacknowledged, in B, D or E under whatever suppression, until it is
 *      acknowledged or its limit is removed. A danger among them stays `highest`.
 * I5   A flagged recording neither lowers the condition nor begins or lengthens an off-delay, nor breaks an on-delay.
 * I6   Whatever is told is unacknowledged afterwards; only `acknowledge` makes it acknowledged.
 * I7   Latched only in a life whose condition is normal; never latched where the condition stands.
 * I8   A changed state has the next version, an unchanged one is the same object; `usedMs` never goes back.
 * I9   Pending never leads to the present condition, and counts rises or falls, never both. Trouble and severities of
 *      limits do not mix.
 * I10  Held back only under a suppression, and only what stands or is latched.
 * I11  Every change of condition is journalled, in an entry that names the condition before and after.
 */

/** The part of the standing that lies under any suppression. */
export type HeldStanding = Exclude<AlarmStanding, 'shelved' | 'suppressed' | 'out-of-service'>;

type Row = Readonly<Record<AlarmCommandName, Act>> & {
  readonly judged: (state: AlarmState, judged: Judged, rule: AlarmRule) => AlarmStep;
};

/** The same in every state: what a recording does follows from the condition, suppressions lie over all states. */
const everywhere = {
  judged: judge,
  shelve: suppressAs('shelved', 'shelved'),
  unshelve: lift('shelved', 'unshelved'),
  'shelf-expired': lift('shelved', 'shelf-expired'),
  'out-of-service': suppressAs('out-of-service', 'out-of-service'),
  'in-service': lift('out-of-service', 'in-service'),
  suppress: suppressAs('by-design', 'suppressed'),
  unsuppress: lift('by-design', 'unsuppressed'),
  'limit-removed': removeLimit,
};

const nothingStands = nothing('nothing stands that could be acknowledged');
const alreadyDone = nothing('it is acknowledged already');
const notHeld = nothing('nothing is held that could be reset');
const notInHand = nothing('nothing stands that somebody has acknowledged');
const stillThere = nothing('its condition still stands; it can be reset when the level has come back');

/** The total table: state by event. */
const transitions: Readonly<Record<HeldStanding, Row>> = {
  normal: { ...everywhere, acknowledge: nothingStands, reset: notHeld, 'say-again': notInHand },
  unacknowledged: { ...everywhere, acknowledge, reset: stillThere, 'say-again': notInHand },
  acknowledged: { ...everywhere, acknowledge: alreadyDone, reset: stillThere, 'say-again': sayAgainInTime },
  'returned-unacknowledged': {
    ...everywhere,
    acknowledge: acknowledgeAndEnd,
    reset: notHeld,
    'say-again': notInHand,
  },
  'latched-unacknowledged': { ...everywhere, acknowledge, reset: release, 'say-again': notInHand },
  'latched-acknowledged': {
    ...everywhere,
    acknowledge: alreadyDone,
    reset: releaseAndEnd,
    'say-again': notInHand,
  },
};

/**
 * One event. `rule` is the limit itself, or the rule of the kind of trouble. Never throws on any state that this
 * machine has made, in whatever order events come.
 */
export function alarmStep(state: AlarmState, event: AlarmEvent, rule: AlarmRule): AlarmStep {
  const row = transitions[heldStanding(state)];
  return event.kind === 'judged' ? row.judged(state, event, rule) : row[event.kind](state, event);
}

/**
 * The state of ISA-18.2 in which an alarm is. Of several suppressions the one that took most authority is named:
 * out of service, then shelved, then suppressed by design.
 */
export function standing(state: AlarmState): AlarmStanding {
  if (state.suppressions.includes('out-of-service')) return 'out-of-service';
  if (state.suppressions.includes('shelved')) return 'shelved';
  if (state.suppressions.includes('by-design')) return 'suppressed';
  return heldStanding(state);
}

/** The state as it would be without suppressions. */
export function heldStanding(state: AlarmState): HeldStanding {
  if (state.highest === null) return 'normal';
  if (state.condition !== 'normal') return state.acknowledged ? 'acknowledged' : 'unacknowledged';
  if (state.latched) return state.acknowledged ? 'latched-acknowledged' : 'latched-unacknowledged';
  return 'returned-unacknowledged';
}

/** A life of the alarm goes on: it stands, is latched, or waits to be acknowledged. */
export function isLive(state: AlarmState): boolean {
  return state.highest !== null;
}
