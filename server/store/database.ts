export { connect, type Connection, type Handle } from '@/db/connect';
