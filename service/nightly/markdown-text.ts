/** Text of the plan, or of a service, as plain text in Markdown, also in a cell of a table. */
export function markdownText(text: string): string {
  return text
    .replace(/[\p{Cc}\u2028\u2029]+/gu, ' ')
    .replace(/[&<>]/g, (character) => ({ '&': '&amp;', '<': '&lt;', '>': '&gt;' })[character]!)
    .replace(/[\\`*_[\]|#~!]/g, '\\$&');
}
