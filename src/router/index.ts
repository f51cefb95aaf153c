import { createRouter, createWebHistory } from 'vue-router'
import type { RouteRecordRaw, RouterHistory } from 'vue-router'
import { cleanCode } from '../composables/useScanTarget.ts'
import type { Permission } from '../shared/contract/permissions.ts'
import { useSessionStore } from '../stores/session.ts'
import { startPlace } from './startPlace.ts'

declare module 'vue-router' {
  interface RouteMeta {
    title: string
    /** which section of the strip it belongs to */
    section?: 'check' | 'instruments'
    /** what it takes; none: anyone who is signed in */
    permission?: Permission
    /** shown without a sign-in and without the strip */
    isPublic?: boolean
  }
}

export const ROUTE_TABLE: RouteRecordRaw[] = [
  { path: '/', name: 'start', component: { render: () => null }, meta: { title: 'Evenstrung' } },
  {
    path: '/check/:serial?',
    name: 'check',
    component: () => import('../views/CheckView.vue'),
    meta: { title: 'Check', section: 'check', permission: 'runChecks' },
  },
  {
    path: '/instruments',
    name: 'instruments',
    component: () => import('../views/InstrumentsView.vue'),
    meta: { title: 'Instruments', section: 'instruments', permission: 'read' },
  },
  {
    path: '/instruments/:serial',
    name: 'instrument',
    component: () => import('../views/InstrumentView.vue'),
    meta: { title: 'Instrument', section: 'instruments', permission: 'read' },
  },
  {
    path: '/runs/:id',
    name: 'run',
    component: () => import('../views/RunView.vue'),
    meta: { title: 'Run', section: 'instruments', permission: 'read' },
  },
  {
    path: '/sign-in',
    name: 'signIn',
    component: () => import('../views/SignInView.vue'),
    meta: { title: 'Sign in', isPublic: true },
  },
  {
    path: '/invite/:token',
    name: 'invite',
    component: () => import('../views/InviteView.vue'),
    meta: { title: 'Welcome', isPublic: true },
  },
  {
    path: '/:rest(.*)*',
    name: 'notFound',
    component: () => import('../views/NotFoundView.vue'),
    meta: { title: 'Not found' },
  },
]

export function makeRouter(history: RouterHistory = createWebHistory()) {
  const router = createRouter({
    history,
    routes: ROUTE_TABLE,
    scrollBehavior: (_to, _from, saved) => saved ?? { top: 0 },
  })
  router.beforeEach(async (to) => {
    // An address that was typed in small letters is the one of the same serial in capitals.
    const { serial } = to.params
    if (typeof serial === 'string' && serial !== cleanCode(serial)) {
      return { ...to, params: { ...to.params, serial: cleanCode(serial) }, replace: true }
    }
    const session = useSessionStore()
    if (session.status === 'unknown') await session.load()
    // Still unknown: the server is out of reach. The page says so and stays where it was asked for.
    if (to.meta.isPublic || session.status === 'unknown') return true
    if (session.status === 'in') return to.name === 'start' ? startPlace() : true
    return { name: 'signIn', query: to.fullPath === '/' ? {} : { next: to.fullPath }, replace: true }
  })
  return router
}
