import { expect, test } from 'vitest';
import { addressGroup } from '@/lib/identity/signInLimits';

// RFC 4291, 2.2 (text forms) and 2.5.5.2 (IPv4-mapped); a subscriber's network has 64 bits (RFC 6177, from memory).
test.each([
  ['192.0.2.7', '192.0.2.7'],
  ['::ffff:192.0.2.7', '192.0.2.7'],
  ['2001:db8:1:2:3:4:5:6', '2001:db8:1:2::/64'],
  ['2001:0DB8:0001:0002::1', '2001:db8:1:2::/64'],
  ['2001:db8::1', '2001:db8:0:0::/64'],
  ['::1', '0:0:0:0::/64'],
  ['fe80::1%eth0', 'fe80:0:0:0::/64'],
  ['unknown', 'unknown'],
])('%s counts as %s', (address, group) => {
  expect(addressGroup(address)).toBe(group);
});
