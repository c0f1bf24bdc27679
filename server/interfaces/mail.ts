export interface Mail {
  to: string;
  subject: string;
  text: string;
}

export interface MailPort {
  send(mail: Mail): Promise<void>;
}

/** This server has no mail server: trying again changes nothing. */
export class MailNotSetUp extends Error {
  constructor() {
    super('no mail server is configured: set EVENFALL_SMTP_URL');
  }
}
