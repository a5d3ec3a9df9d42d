import type { SampleLayout } from '../config/sample-layout.ts';
import type { Refusal } from './recording.ts';

/** More channels than this are no recording; so a side that is longer can only be that of the samples. */
export const mostChannels = 1024;

/** An array of samples: how many frames and channels, and which of its two sides is which. */
export interface ArrayShape {
  readonly frames: number;
  readonly channels: number;
  /** `columns`: frames x channels; `rows`: channels x frames. */
  readonly channelsIn: 'columns' | 'rows';
}

/**
 * What the sides of an array mean. One side is one channel. Of two, the site file says which is that of the channels;
 * where it does not, the one that is no longer than 1024 while the other is. Anything else is refused, not guessed.
 * `what` names the array for people.
 */
export function arrayShape(
  sides: readonly number[],
  channelsIn: SampleLayout['channelsIn'],
  what: string,
): ArrayShape | Refusal {
  const refuse = (reason: string): Refusal => ({ refused: 'unsupported', reason: `${what}: ${reason}` });
  const shown = sides.slice(0, 8).join(' x ');
  const [first = 0, second = 0] = sides;
  if (sides.length === 1) return { frames: first, channels: 1, channelsIn: 'columns' };
  if (sides.length !== 2) {
    const how = sides.length === 0 ? 'a single number' : `${sides.length} dimensions (${shown})`;
    return refuse(`${how}; one is expected, or two of samples and channels`);
  }
  const said = channelsIn ?? told(first, second);
  if (said === null) {
    return refuse(
      `${shown} may be samples x channels or channels x samples; say channels_in: columns or channels_in: rows`,
    );
  }
  const [frames, channels] = said === 'columns' ? [first, second] : [second, first];
  if (channels > mostChannels)
    return refuse(
      `${shown} with channels in ${said} has ${channels} channels, more than ${mostChannels}; is it the other way round?`,
    );
  if (channels === 0) return refuse(`${shown} holds no channel`);
  return { frames, channels, channelsIn: said };
}

function told(first: number, second: number): 'columns' | 'rows' | null {
  if (first > mostChannels && second <= mostChannels) return 'columns';
  if (second > mostChannels && first <= mostChannels) return 'rows';
  return null;
}
