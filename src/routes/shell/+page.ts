// The offline shell. It must not be rendered on the server: a rendered page would hydrate itself
// under every offline address instead of the page that belongs there.
export const ssr = false;
export const prerender = true;
