import type { Message } from '@/lib/mail/port';
import type { Services } from '@/lib/platform/services';
import { ROLE_NAMES, type Role } from './permissions';

/** The messages that people get about their account: plain words, and links to our own address only. */
type House = Pick<Services, 'env'>;

const signed = (services: House, lines: string[]): string =>
  [...lines, '', `Bellkeep, ${services.env.BELLKEEP_HOSPITAL}`].join('\n');

/** One line of a message: nothing in a name can start another. */
const line = (text: string): string => text.replace(/\p{C}+/gu, ' ').trim();

export function invitationLetter(
  services: House,
  to: { email: string; name: string; roles: readonly Role[] },
  by: string,
  token: string,
): Message {
  return {
    to: to.email,
    subject: 'You are invited to Bellkeep',
    text: signed(services, [
      `${line(to.name)},`,
      '',
      `${line(by)} invites you to Bellkeep as ${to.roles.map((role) => ROLE_NAMES[role].toLowerCase()).join(' and ')}.`,
      '',
      'Open this within seven days to choose your password:',
      `${services.env.BELLKEEP_ORIGIN}/invite/${token}`,
      '',
      'The address works once. If you did not expect it, leave it, or ask your IT department.',
    ]),
  };
}

export function resetLetter(services: House, email: string, token: string): Message {
  return {
    to: email,
    subject: 'Set a new password for Bellkeep',
    text: signed(services, [
      `Somebody, probably you, asked to set a new password for ${email}.`,
      '',
      'Open this within an hour:',
      `${services.env.BELLKEEP_ORIGIN}/reset/${token}`,
      '',
      'The address works once. If it was not you, leave it: nothing changes without it.',
    ]),
  };
}

const NOTICES = {
  'password-changed': {
    subject: 'Your password for Bellkeep was changed',
    text: 'The password of your account was changed, and the sessions elsewhere were ended.',
  },
  'second-factor-set': {
    subject: 'A second factor was set up for Bellkeep',
    text: 'An authenticator was set up as the second factor of your account.',
  },
  'second-factor-removed': {
    subject: 'The second factor of Bellkeep was removed',
    text: 'The second factor of your account was removed. Set up a new one when you sign in.',
  },
  'passkey-added': {
    subject: 'A passkey was added for Bellkeep',
    text: 'A passkey was added to your account. It signs in without a password.',
  },
  'passkey-removed': {
    subject: 'A passkey of Bellkeep was removed',
    text: 'A passkey was removed from your account.',
  },
} as const;

/** Tell somebody that the way into their account changed, in case it was not they who did it. */
export function noticeLetter(services: House, email: string, what: keyof typeof NOTICES): Message {
  const { subject, text } = NOTICES[what];
  return {
    to: email,
    subject,
    text: signed(services, [
      text,
      '',
      'If that was not you, tell your IT department at once, and set a new password:',
      `${services.env.BELLKEEP_ORIGIN}/forgot`,
    ]),
  };
}
