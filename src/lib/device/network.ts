/** All that talks to the server, as the one piece that comes behind the page; see `sync.ts`. */
export { SyncLoop } from './loop';
export { httpTransport } from './transport';
