import packageFacts from '@/package.json';

/** Version of this program, as archives and the API name it. */
export const softwareVersion: string = packageFacts.version;
