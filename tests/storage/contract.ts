import { describeObjects } from './contractObjects';
import { describePresigned } from './contractPresigned';
import { describeSealing } from './contractSealing';
import type { StoreUnderTest } from './storeUnderTest';

/** What Bellkeep needs of any store, said as outcomes. */
export function describeStorageContract(name: string, get: () => StoreUnderTest): void {
  describePresigned(name, get);
  describeObjects(name, get);
  describeSealing(name, get);
}
