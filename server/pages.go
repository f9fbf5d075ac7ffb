package server

import "net/http"

func (s *Server) showStart(w http.ResponseWriter, r *http.Request) error   { return errNotFound }
func (s *Server) showDesign(w http.ResponseWriter, r *http.Request) error  { return errNotFound }
func (s *Server) showExample(w http.ResponseWriter, r *http.Request) error { return errNotFound }
func (s *Server) sizeDesign(w http.ResponseWriter, r *http.Request) error  { return errNotFound }
func (s *Server) renewAnswer(w http.ResponseWriter, r *http.Request) error { return errNotFound }
func (s *Server) showWorking(w http.ResponseWriter, r *http.Request) error { return errNotFound }
func (s *Server) showSheet(w http.ResponseWriter, r *http.Request) error   { return errNotFound }
func (s *Server) saveFile(w http.ResponseWriter, r *http.Request) error    { return errNotFound }
func (s *Server) openFile(w http.ResponseWriter, r *http.Request) error    { return errNotFound }
