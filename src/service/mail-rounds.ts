import type { Mailer } from '../advisory/mailer.ts';
import type { MailServer } from '../config/site.ts';

export type MailerFor = (server: MailServer) => Mailer;

export class MailRounds {
  constructor(_tools: object) {}
  async announce(_how: 'first' | 'unclean' | 'clean'): Promise<void> {}
  async round(_flush: boolean): Promise<{ againInMs: number | null; waiting: number }> {
    return { againInMs: null, waiting: 0 };
  }
  async morning(): Promise<string | null> {
    return null;
  }
}
