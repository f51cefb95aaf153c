import path from 'node:path'
import { Router, static as serveStatic } from 'express'

/** The built page: hashed files for a year, index.html for every address that the page's router knows. */
export function clientFiles(clientDir: string): Router {
  const router = Router()
  router.use(
    '/assets',
    serveStatic(path.join(clientDir, 'assets'), { maxAge: '1y', immutable: true, index: false }),
  )
  router.use(serveStatic(clientDir, { maxAge: 0, index: false }))
  router.get('/{*address}', (req, res, next) => {
    const isFile = path.extname(req.path) !== '' || req.path.startsWith('/assets/')
    if (isFile || !req.accepts('html')) {
      next()
      return
    }
    res.set('Cache-Control', 'no-cache')
    res.sendFile('index.html', { root: clientDir, cacheControl: false }, (error) => {
      if (error) next((error as NodeJS.ErrnoException).code === 'ENOENT' ? undefined : error)
    })
  })
  return router
}
