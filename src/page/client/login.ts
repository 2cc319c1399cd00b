/**
 * A link from elsewhere comes without the cookie (SameSite=Strict). From this page, which is of the same site,
 * it travels along: whoever has logged in before is let in at once.
 */
const answer = await fetch('/state', { method: 'HEAD' })
if (answer.ok && location.pathname === '/') location.replace(location.href)

export {}
