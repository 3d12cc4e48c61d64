import { describe, expect, it } from 'vitest';

import { createLatestTask } from '#client/design/latest-task.ts';

describe('latest task', () => {
  const held = () => {
    const ran: number[] = [];
    const scheduled: (() => void)[] = [];
    const push = createLatestTask<number>((request) => ran.push(request), (task) => scheduled.push(task));
    return { ran, push, scheduled, next: () => scheduled.shift()?.() };
  };

  it('runs the newest of the requests that came before its turn, once', () => {
    const { ran, push, next, scheduled } = held();
    for (const request of [1, 2, 3]) push(request);
    expect(scheduled).toHaveLength(1);
    next();
    next();
    expect(ran).toEqual([3]);
  });

  it('runs something at every turn under a steady stream of requests, each later than the one before', () => {
    const { ran, push, next } = held();
    for (let k = 1; k <= 30; k++) {
      push(k);
      if (k % 3 === 0) next();
    }
    expect(ran).toEqual([3, 6, 9, 12, 15, 18, 21, 24, 27, 30]);
  });

  it('takes a request that comes while another runs', () => {
    const scheduled: (() => void)[] = [];
    const ran: number[] = [];
    const push = createLatestTask<number>(
      (request) => {
        ran.push(request);
        if (request === 1) push(2);
      },
      (task) => scheduled.push(task),
    );
    push(1);
    while (scheduled.length > 0) scheduled.shift()!();
    expect(ran).toEqual([1, 2]);
  });

  it('goes on after a run that throws', () => {
    const scheduled: (() => void)[] = [];
    const ran: number[] = [];
    const push = createLatestTask<number>(
      (request) => {
        if (request === 1) throw new Error('no mesh');
        ran.push(request);
      },
      (task) => scheduled.push(task),
    );
    push(1);
    expect(() => scheduled.shift()!()).toThrow('no mesh');
    push(2);
    scheduled.shift()!();
    expect(ran).toEqual([2]);
  });
});
