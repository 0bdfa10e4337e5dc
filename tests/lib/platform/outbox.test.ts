import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { outbox } from '@/db/schema';
import { enqueueMail } from '@/lib/mail/enqueue';
import { runOutboxOnce } from '@/lib/platform/outbox';
import { type House, openHouse } from '@/tests/support/services';

const MESSAGE = { to: 'a@harrowmere.example', subject: 'Hello', text: 'secret-token-in-it' };
let house: House;
beforeEach(async () => {
  house = await openHouse();
});
afterEach(() => house.close());

const enqueue = () => house.services.write((tx) => enqueueMail(tx, house.clock.now(), MESSAGE));
const rows = () => house.services.read.select().from(outbox);
const failing = { mail: () => Promise.reject(new Error('the server is down')) };

describe('a message', () => {
  test('is not sent when the change that wanted it is rolled back', async () => {
    await house.services
      .write(async (tx) => {
        await enqueueMail(tx, house.clock.now(), MESSAGE);
        throw new Error('no');
      })
      .catch(() => undefined);
    expect(await house.deliver()).toEqual([]);
  });

  test('is sent once by several that look at the same moment', async () => {
    await enqueue();
    let sent = 0;
    const handlers = {
      mail: async () => {
        await new Promise((resolve) => setTimeout(resolve, 20));
        sent++;
      },
    };
    await Promise.all([1, 2, 3].map(() => runOutboxOnce(house.services, handlers)));
    expect(sent).toBe(1);
  });

  test('is tried again later and later while the server is down, and sent when it is back', async () => {
    await enqueue();
    const waits: number[] = [];
    for (let i = 0; i < 8; i++) {
      await runOutboxOnce(house.services, failing);
      const [row] = await rows();
      waits.push(Math.round(((row?.dueAt ?? 0) - house.clock.now()) / 60_000));
      house.clock.advance((row?.dueAt ?? 0) - house.clock.now());
    }
    expect(waits).toEqual([1, 2, 4, 8, 16, 32, 60, 60]);
    expect(await house.deliver()).toEqual([MESSAGE]);
    expect(await house.deliver()).toHaveLength(1);
  });

  test('is set aside after twelve tries', async () => {
    await enqueue();
    for (let i = 0; i < 12; i++) {
      await runOutboxOnce(house.services, failing);
      house.clock.advance(3_600_001);
    }
    expect((await rows())[0]).toMatchObject({ tries: 12, lastError: 'Error' });
    expect((await rows())[0]?.deadAt).not.toBeNull();
    expect(await house.deliver()).toEqual([]);
  });

  test('is sent by the next process when one died while sending', async () => {
    await enqueue();
    const stuck = runOutboxOnce(house.services, { mail: () => new Promise(() => undefined) });
    await new Promise((resolve) => setTimeout(resolve, 50));
    expect(await house.deliver()).toEqual([]);
    house.clock.advance(60_001);
    expect(await house.deliver()).toEqual([MESSAGE]);
    void stuck;
  });

  test('leaves nothing of its text behind once it is sent', async () => {
    await enqueue();
    await house.deliver();
    expect(JSON.stringify(await rows())).not.toContain('secret-token-in-it');
    expect(house.log.join()).not.toContain('secret-token-in-it');
  });

  test('does not keep others waiting when it fails', async () => {
    await enqueue();
    await house.services.write((tx) =>
      enqueueMail(tx, house.clock.now(), { ...MESSAGE, to: 'b@harrowmere.example' }),
    );
    const sent: unknown[] = [];
    await runOutboxOnce(house.services, {
      mail: async (payload) => {
        if (payload.to === MESSAGE.to) throw new Error('this one will not go');
        sent.push(payload.to);
      },
    });
    expect(sent).toEqual(['b@harrowmere.example']);
  });
});
