/** The one function that the figures use of svgdom, which ships no types of its own. */
declare module 'svgdom' {
  /** A window with an empty SVG document, enough of a DOM for svg.js to build in. */
  export function createSVGWindow(): { readonly document: { readonly documentElement: unknown } };
}
