export interface Mail {
  to: string;
  subject: string;
  text: string;
}

export interface MailPort {
  send(mail: Mail): Promise<void>;
}
