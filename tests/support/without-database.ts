import { setTimeout as pause } from 'node:timers/promises';
import type { LabServer } from './lab-server';

/**
 * Does `work` while the database of a lab's server does not answer, and goes on when everybody has found it again. Until then the clock goes
 * little by little: this database answers in real time, and where it is slow it would be found away once more.
 */
export const withoutDatabase = (lab: LabServer, work: () => Promise<void>): Promise<void> =>
  lab.world.withoutDatabase(async () => {
    const { services } = lab.built;
    const { pool } = services.database;
    const working = { connect: pool.connect.bind(pool), query: pool.query.bind(pool) };
    const away = () => Promise.reject(Object.assign(new Error('connect ECONNREFUSED 127.0.0.1'), { code: 'ECONNREFUSED' }));
    Object.assign(pool, { connect: away, query: away });
    await work().finally(() => Object.assign(pool, working));
    let isBack = false;
    const back = async () => {
      do await services.idle();
      while (services.databaseAwaySinceUtcMs() !== null);
      isBack = true;
    };
    const found = back();
    while (!isBack) {
      await lab.advance(50);
      await pause(5);
    }
    await found;
  });
