/** Points that fall silent while the drop folder is never at rest. */
import { expect, it } from 'vitest';
import { stamp, wav } from './site-on-disk.ts';
import { trial } from './trial.ts';

const minuteMs = 60_000;

it('a silent point is overdue although another logger always has a file half written', async () => {
  const service = await trial({ recordings: 'overdue_after: 2 h' });
  await service.hour(0);
  // A recorder that writes one recording of nine minutes after the other straight into the folder.
  let name = '';
  for (let minute = 0; minute < 150; minute += 3) {
    if (minute % 9 === 0) {
      if (minute > 0) service.drop(name, wav([1, 1], minute));
      name = `press-1_${stamp(service.clock.wallMs())}.wav`;
    }
    service.drop(name, wav([1, 1], minute).subarray(0, 600 + 100 * (minute % 9)));
    for (const ms of [0, 6000]) expect((await service.after(ms)).waiting).toBeGreaterThan(0);
    service.clock.advance(3 * minuteMs - 6000);
  }
  expect(await service.standing()).toEqual(['overdue pump-2/de-v trouble']);
});
