/** What a process does: `web` answers pages and programs, `rig` drives rigs, `worker` does jobs and chores. */
export const processRoles = ['web', 'rig', 'worker'] as const;
export type ProcessRole = (typeof processRoles)[number];

/** A bucket of S3, or of a server that speaks like it. */
export interface S3Place {
  bucket: string;
  region: string;
  /** Address of a server that is not Amazon's; null: Amazon's. */
  endpoint: string | null;
  /** What the names of this server's objects begin with. */
  prefix: string;
  keyId: string;
  secret: string;
}

/** Everything the environment decides, read once by `server/boot/config.ts`. */
export interface ServerConfig {
  /** `production` strips what a contract does not name from an answer; elsewhere such an answer is an error. */
  mode: 'production' | 'development' | 'test';
  /** All of them in one process by default. */
  roles: readonly ProcessRole[];
  databaseUrl: string;
  host: string;
  /** 0: any free port. */
  port: number;
  /** Address under which people reach the server, without a slash at its end; decides links in mails, cookies and the same-origin check. Null: the request's own host. */
  publicUrl: string | null;
  /** Number of reverse proxies in front whose forwarded addresses are believed. */
  trustedProxies: number;
  /** Demo lab and demo accounts exist, mails are written as files. */
  demo: boolean;
  /** Exit delay when a rig is armed that is part of this server, s; that of a real rig is always 2 min. */
  virtualExitDelayS: number;
  /** A process whose event loop lags by more than a second for so long ends itself, s. */
  watchdogS: number;
  /** Folder for what is not in the database: mails of the demo, journals. */
  stateDir: string;
  /** What passwords in the database are sealed with; null: with a key that lies in the state folder. */
  secretKey: string | null;
  /** Folder of the files that people brought in; not used where they are in S3. */
  filesDir: string;
  s3: S3Place | null;
  /** Folder on the disk of PostgreSQL's data; null: found out where that is possible. */
  databaseDir: string | null;
  /** Folder of the built web application; null: none is served. */
  webDir: string | null;
  smtpUrl: string | null;
  mailFrom: string;
  /** Hosts (`name:port`) of the own network that a sign of life or a push message may go to, also without TLS; all others must be public and speak https. */
  privateHosts: readonly string[];
  /** Hosts (`name:port`) at which cameras may be; no other is asked for a picture. */
  cameraHosts: readonly string[];
  /** Port on loopback with figures for Prometheus, 0: any free one; null: none. */
  metricsPort: number | null;
  logLevel: 'silent' | 'fatal' | 'error' | 'warn' | 'info' | 'debug';
  limits: {
    /** Requests a minute and address, without hold and stop. */
    requestsPerMinute: number;
    /** Holds and stops a minute and address: a bucket of their own, so that nothing else can use it up. */
    interventionsPerMinute: number;
    jsonBytes: number;
    importBytes: number;
    streamsPerUser: number;
  };
  /** What each device may append. */
  devices: {
    batchBytes: number;
    batchesPerMinute: number;
    samplesPerMinute: number;
  };
}
