/** Host and port of `HOST:PORT`, `[IPv6]:PORT` or an http(s) address; null where it is none of them. */
export function hostAndPort(address: string): { readonly host: string; readonly port: number } | null {
  if (address.includes('://')) {
    try {
      const { hostname, port, protocol } = new URL(address)
      return {
        host: hostname.replace(/^\[|\]$/g, ''),
        port: Number(port || (protocol === 'https:' ? 443 : 80)),
      }
    } catch {
      return null
    }
  }
  const parts = /^(?:\[([^\]]+)\]|([^:]+)):(\d{1,5})$/.exec(address)
  if (!parts) return null
  const port = Number(parts[3])
  return port > 65_535 ? null : { host: parts[1] ?? parts[2] ?? '', port }
}

/** Whether a host is this machine itself: localhost (RFC 6761), 127.0.0.0/8 (RFC 1122) or ::1 (RFC 4291). */
function isLoopbackHost(host: string): boolean {
  const bare = host.toLowerCase().replace(/\.$/, '')
  return (
    bare === 'localhost' ||
    bare.endsWith('.localhost') ||
    /^127(\.\d{1,3}){3}$/.test(bare) ||
    /^(0{0,4}:){2,7}0{0,3}1$/.test(bare)
  )
}

export function isLoopback(address: string): boolean {
  const parts = hostAndPort(address)
  return parts !== null && isLoopbackHost(parts.host)
}
