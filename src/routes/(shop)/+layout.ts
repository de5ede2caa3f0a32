// Works with no network: drawn by the browser from the device store, never by the server.
export const ssr = false;
