import type { Services } from '@/lib/platform/services';
import {
  clocks,
  database,
  disk,
  heads,
  type Needs,
  outboxDepth,
  type PoolFigures,
  pool,
  storage,
  sweep,
} from './parts';
import type { HealthPart } from './types';

const PATIENCE_MS = 5_000;

interface Look {
  id: HealthPart['id'];
  title: string;
  look: () => Promise<HealthPart | null> | HealthPart | null;
}

/** A part that cannot even be looked at is an alarm in our words; the cause is for the log. */
async function looked(
  services: Pick<Services, 'log'>,
  { id, title, look }: Look,
): Promise<HealthPart | null> {
  let timer: NodeJS.Timeout | undefined;
  const patience = new Promise<never>((_, reject) => {
    timer = setTimeout(() => reject(new Error('no answer in time')), PATIENCE_MS);
  });
  try {
    return await Promise.race([Promise.resolve(look()), patience]);
  } catch (error) {
    services.log.warn({ err: error, part: id }, 'a part of the house does not answer');
    return { id, title, state: 'alarm', sentence: 'It does not answer.', figures: [] };
  } finally {
    clearTimeout(timer);
  }
}

/** How the house is, each part by looking at it. Parts are looked at side by side; one that hangs holds up none. */
export async function readHealth(
  services: Needs & Pick<Services, 'log'>,
  poolFigures: PoolFigures | null,
): Promise<HealthPart[]> {
  const looks: Look[] = [
    { id: 'database', title: 'Database', look: () => database(services) },
    { id: 'storage', title: 'Storage', look: () => storage(services) },
    { id: 'outbox', title: 'Outbox', look: () => outboxDepth(services) },
    { id: 'sweep', title: 'Sweep', look: () => sweep(services) },
    { id: 'heads', title: 'Tree heads', look: () => heads(services) },
    { id: 'pool', title: 'Analysis', look: () => pool(poolFigures) },
    { id: 'clocks', title: 'Clocks', look: () => clocks(services) },
    { id: 'disk', title: 'Disk', look: () => disk(services) },
  ];
  const parts = await Promise.all(looks.map((look) => looked(services, look)));
  return parts.filter((part) => part !== null);
}
