import { describe, expect, it } from 'vitest';

import { createLatestQueue } from '#client/design/latest-queue.ts';

describe('latest queue', () => {
  const held = () => {
    const started: number[] = [];
    const finish: (() => void)[] = [];
    let idle = 0;
    const queue = createLatestQueue<number>(
      (request) => {
        started.push(request);
        return new Promise<void>((resolve) => finish.push(resolve));
      },
      () => idle++,
    );
    const next = async () => {
      finish.shift()!();
      await new Promise((resolve) => setTimeout(resolve));
    };
    return { queue, started, next, idle: () => idle };
  };

  it('starts the first request at once and then only the newest of those that came meanwhile', async () => {
    const { queue, started, next } = held();
    for (const request of [1, 2, 3, 4]) queue.push(request);
    expect(started).toEqual([1]);
    await next();
    expect(started).toEqual([1, 4]);
  });

  it('finishes what it began under a steady stream of requests', async () => {
    const { queue, started, next } = held();
    for (let k = 0; k < 30; k++) {
      queue.push(k);
      if (k % 3 === 2) await next();
    }
    expect(started).toEqual([0, 2, 5, 8, 11, 14, 17, 20, 23, 26, 29]);
  });

  it('is idle once, after the last request', async () => {
    const { queue, next, idle } = held();
    queue.push(1);
    queue.push(2);
    await next();
    expect([queue.isBusy, idle()]).toEqual([true, 0]);
    await next();
    expect([queue.isBusy, idle()]).toEqual([false, 1]);
  });

  it('drops a waiting request on clear', async () => {
    const { queue, started, next } = held();
    queue.push(1);
    queue.push(2);
    queue.clear();
    await next();
    expect(started).toEqual([1]);
  });
});
